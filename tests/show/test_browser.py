"""The lab's report in a real browser: quiet, self-contained, sortable, filterable, keyboard reachable, printable."""

from __future__ import annotations

import base64
import re
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import Any

import pytest

from electrolog.answers.kept_backtest import KeptBacktest
from electrolog.answers.report import BatchSheet, LabSheet, Origin
from electrolog.answers.shelf import STATES, Shelved
from electrolog.show.report_page import Told, write_report
from tests.browsing import asked_of_networks, colour, contrast, overhang_px
from tests.show.known_backtest import backtest

MADE = datetime(2026, 3, 2, 9, 30, tzinfo=UTC)
PROBES = 2000
SECONDS_OF_WORK = 2.0  # of the browser's own processor; a page that is read at once takes about a third of it


def shelved(k: int) -> Shelved:
    value = None if k % 7 == 0 else 5.0 + (k * 37 % 200) / 10
    return Shelved(
        electrode=f"B{k // 10:03d}-{k % 10:02d}",
        state=STATES[k % 5],
        batch=f"B{k // 10:03d}",
        made_by=("wren", "ibis")[k % 2],
        coating=("PFSA", None)[k % 2],
        fibre="carbon fibre 7 um",
        age_days=k % 300,
        exposure_h=k % 17 / 2,
        uses=k % 5,
        calibrations=3,
        last_calibration=None if value is None else MADE - timedelta(days=k % 90),
        analyte="dopamine",
        waveform="triangle",
        sensitivity_na_um=value,
        sensitivity_se_na_um=0.2,
        share_left=0.8,
        reason="broken" if k % 5 == 4 else None,
        trend_na_um=(10.0, 9.0, 8.0),
    )


@pytest.fixture(scope="module")
def page(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("report") / "lab.html"
    batch = BatchSheet("B000", MADE.date(), "wren", "carbon fibre 7 um", 10, 2, 8, 10)
    tested = (KeptBacktest(backtest(), MADE, 3, corrected_since=False),)
    shelf = tuple(map(shelved, range(PROBES)))
    lab = LabSheet(shelf, (batch,), (), ("dopamine",), (), None, "no run was named", tested)
    made = Origin("wren", MADE, "0", "lab.db", 12, "ab" * 32, {"calibration": "line"})
    write_report(path, Told("The lab", made, lab=lab))
    return path


@pytest.fixture
def opened(browser: Any, page: Path) -> Any:
    browser.get_log("performance")
    browser.get(page.as_uri())
    return browser


def shown(browser: Any) -> list[str]:
    return list(
        browser.execute_script(
            "return [...document.querySelectorAll('#shelf tbody tr:not([hidden])')].map(r => r.cells[0].textContent)"
        )
    )


def column(browser: Any, at: int) -> list[str]:
    rows = "[...document.querySelectorAll('#shelf tbody tr')]"
    return list(browser.execute_script(f"return {rows}.map(r => r.cells[{at}].dataset.v)"))


def press(browser: Any, heading: str) -> None:
    from selenium.webdriver.common.by import By

    browser.find_element(By.XPATH, f"//th[button[text()='{heading}']]/button").click()


def test_the_page_is_small(page: Path) -> None:
    assert page.stat().st_size < 5_000_000


def test_nothing_is_asked_of_any_network_and_the_console_is_silent(opened: Any, page: Path) -> None:
    assert asked_of_networks(opened) == {page.as_uri()}
    assert opened.get_log("browser") == []


def test_two_thousand_probes_are_there_at_once(opened: Any) -> None:
    metrics = opened.execute_cdp_cmd("Performance.getMetrics", {})["metrics"]
    assert {one["name"]: one["value"] for one in metrics}["TaskDuration"] < SECONDS_OF_WORK


def test_usable_ones_are_shown_first_and_all_on_request(opened: Any) -> None:
    from selenium.webdriver.common.by import By
    from selenium.webdriver.support.ui import Select

    assert len(shown(opened)) == PROBES * 4 // 5
    choice = Select(opened.find_element(By.CSS_SELECTOR, "[data-for=shelf] select"))
    choice.select_by_visible_text("all")
    assert len(shown(opened)) == PROBES
    choice.select_by_visible_text("retired")
    assert len(shown(opened)) == PROBES // 5
    assert opened.find_element(By.CSS_SELECTOR, "output").text == "400 of 2000 probes"


def test_words_filter_rows(opened: Any) -> None:
    from selenium.webdriver.common.by import By

    opened.find_element(By.CSS_SELECTOR, "[data-for=shelf] input").send_keys("B01 pfsa")
    expected = [one.electrode for one in map(shelved, range(PROBES)) if matches(one)]
    assert shown(opened) == expected


def matches(one: Shelved) -> bool:
    return one.electrode.startswith("B01") and one.coating == "PFSA" and one.state != "retired"


def test_numbers_sort_as_numbers_with_the_unknown_last_either_way(opened: Any) -> None:
    known = sorted(one.sensitivity_na_um for one in map(shelved, range(PROBES)) if one.sensitivity_na_um is not None)
    press(opened, "nA/µM")
    up = column(opened, 9)
    assert [float(value) for value in up[: len(known)]] == pytest.approx(known)
    assert set(up[len(known) :]) == {""}
    press(opened, "nA/µM")
    down = column(opened, 9)
    assert [float(value) for value in down[: len(known)]] == pytest.approx(known[::-1])
    assert set(down[len(known) :]) == {""}


def test_the_sorted_heading_says_so_to_a_screen_reader(opened: Any) -> None:
    press(opened, "left")
    press(opened, "probe")
    sorted_by = opened.execute_script("return [...document.querySelectorAll('[aria-sort]')].map(h => h.ariaSort)")
    assert sorted_by == ["ascending"]


def test_everything_is_reached_by_the_keyboard(opened: Any) -> None:
    from selenium.webdriver.common.keys import Keys

    reached = []
    for _ in range(9):
        opened.switch_to.active_element.send_keys(Keys.TAB)
        reached.append(opened.execute_script("return document.activeElement.tagName"))
    assert reached == ["A"] * 5 + ["INPUT", "SELECT", "BUTTON", "BUTTON"]  # past the skip link and four places
    opened.switch_to.active_element.send_keys(Keys.ENTER)
    assert opened.execute_script("return document.querySelector('th[aria-sort]').textContent").startswith("state")


def test_a_chart_is_one_stop_and_the_arrows_go_from_value_to_value(opened: Any) -> None:
    from selenium.webdriver.common.keys import Keys

    counts = backtest().methods[0].pit_counts
    opened.execute_script("document.querySelectorAll('svg.chart')[1].focus()")
    assert said_of_chart(opened) == "arrow keys: from value to value"
    seen = []
    for _ in range(len(counts) + 1):
        opened.switch_to.active_element.send_keys(Keys.ARROW_RIGHT)
        seen.append(said_of_chart(opened))
    assert seen[0] == f"1 of {len(seen)}: expected of honest forecasts: 40 in each"
    assert [int(re.findall(r": (\d+) readings?,", text)[0]) for text in seen[1:]] == list(counts)
    opened.switch_to.active_element.send_keys(Keys.ARROW_RIGHT)  # the last one stays
    assert said_of_chart(opened) == seen[-1]
    assert opened.execute_script("return document.querySelectorAll('.chosen').length") == 1
    opened.switch_to.active_element.send_keys(Keys.ESCAPE)
    assert said_of_chart(opened) == ""
    opened.switch_to.active_element.send_keys(Keys.TAB)
    assert opened.execute_script("return document.activeElement.tagName") == "SUMMARY"


def said_of_chart(browser: Any) -> str:
    return str(browser.execute_script("return document.querySelectorAll('figure output')[1].textContent"))


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_text_stands_out_from_its_ground_in_light_and_dark(opened: Any, scheme: str) -> None:
    """WCAG 2.2, 1.4.3: a contrast of 4.5 or more."""
    media = {"features": [{"name": "prefers-color-scheme", "value": scheme}]}
    opened.execute_cdp_cmd("Emulation.setEmulatedMedia", media)
    ground = colour(opened, "body", "backgroundColor")
    for selector in ("body", ".origin", "caption", "th"):
        assert contrast(colour(opened, selector, "color"), ground) >= 4.5
    assert (sum(ground) < 200) == (scheme == "dark")


@pytest.mark.parametrize(("paper", "width_mm"), [("A4", 210), ("Letter", 215.9)])
def test_no_table_is_wider_than_the_paper(opened: Any, paper: str, width_mm: float) -> None:
    assert overhang_px(opened, width_mm) <= 1, paper


def test_it_prints(opened: Any) -> None:
    made = opened.execute_cdp_cmd(
        "Page.printToPDF", {"preferCSSPageSize": False, "paperWidth": 8.27, "paperHeight": 11.69}
    )
    assert base64.b64decode(made["data"]).startswith(b"%PDF")
