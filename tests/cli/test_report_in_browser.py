"""A probe's page in a real browser: quiet, read by the arrow keys, legible in light and dark, no table cut on paper."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from tests.browsing import asked_of_networks, colour, contrast, overhang_px

RUN = ("--analyte", "DA", "--waveform", "triangle", "--setting", "in-vivo", "--run", "2h")


@pytest.fixture
def opened(judged: Any, browser: Any, tmp_path: Path) -> Any:
    judged.ok("note", "R1", "x" * 3000, "--at", "2026-01-21T09:00Z")
    judged.ok("report", "R1", "R2", *RUN, "--out", "page.html")
    browser.get_log("performance")
    browser.get((tmp_path / "page.html").as_uri())
    return browser


def test_it_asks_nothing_of_any_network_and_the_console_is_silent(opened: Any, tmp_path: Path) -> None:
    assert asked_of_networks(opened) == {(tmp_path / "page.html").as_uri()}
    assert opened.get_log("browser") == []


def test_the_arrow_keys_say_every_reading_of_the_course(opened: Any) -> None:
    from selenium.webdriver.common.keys import Keys

    opened.execute_script("document.querySelector('svg.chart').focus()")
    opened.switch_to.active_element.send_keys(Keys.HOME)
    said = []
    for _ in range(count_of(opened)):
        said.append(opened.execute_script("return document.querySelector('figure output').textContent"))
        opened.switch_to.active_element.send_keys(Keys.ARROW_RIGHT)
    assert any(text.partition(": ")[2].startswith("R1/0, ") for text in said)
    assert any(text.partition(": ")[2].startswith("forecast at ") for text in said)
    assert len(set(said)) == len(said)


def count_of(browser: Any) -> int:
    said = browser.execute_script("return document.querySelector('figure output').textContent")
    return int(said.split(" of ")[1].partition(":")[0])


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_text_stands_out_in_light_and_dark(opened: Any, scheme: str) -> None:
    """WCAG 2.2, 1.4.3: a contrast of 4.5 or more."""
    media = {"features": [{"name": "prefers-color-scheme", "value": scheme}]}
    opened.execute_cdp_cmd("Emulation.setEmulatedMedia", media)
    ground = colour(opened, "body", "backgroundColor")
    for selector in ("body", ".origin", "dt", "nav a", ".verdict", "figcaption", "summary", "caption"):
        assert contrast(colour(opened, selector, "color"), ground) >= 4.5, selector
    assert contrast(colour(opened, "svg.chart text", "fill"), ground) >= 4.5
    assert (sum(ground) < 200) == (scheme == "dark")


@pytest.mark.parametrize(("paper", "width_mm"), [("A4", 210), ("Letter", 215.9)])
def test_no_table_is_cut_on_paper(opened: Any, paper: str, width_mm: float) -> None:
    assert overhang_px(opened, width_mm) <= 1, paper


def test_a_sentence_in_a_table_keeps_a_width_to_be_read_at(opened: Any) -> None:
    """A narrow window once left it a column of single letters, beyond the right edge."""
    size = {"width": 700, "height": 900, "deviceScaleFactor": 1, "mobile": False}
    opened.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", size)
    try:
        script = "return [...document.querySelectorAll('td.long')].map(cell => cell.clientWidth)"
        widths = opened.execute_script(script)
    finally:
        opened.execute_cdp_cmd("Emulation.clearDeviceMetricsOverride", {})
    assert widths
    assert min(widths) >= 150
