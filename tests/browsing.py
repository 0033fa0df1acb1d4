"""A real browser, and what is asked of a page in it."""

from __future__ import annotations

import json
import re
import shutil
from collections.abc import Iterator
from typing import Any

import pytest

MARGINS_MM = 28


@pytest.fixture(scope="session")
def browser() -> Iterator[Any]:
    chromium, driver = (shutil.which(name) for name in ("chromium", "chromedriver"))
    if chromium is None or driver is None:
        pytest.skip("no chromium with its driver on this machine: `apt-get install chromium chromium-driver`")
    from selenium import webdriver
    from selenium.webdriver.chrome.service import Service

    options = webdriver.ChromeOptions()
    options.binary_location = chromium
    for argument in ("--headless=new", "--no-sandbox", "--disable-gpu", "--window-size=1200,900"):
        options.add_argument(argument)
    options.set_capability("goog:loggingPrefs", {"browser": "ALL", "performance": "ALL"})
    started = webdriver.Chrome(options=options, service=Service(driver))
    started.execute_cdp_cmd("Performance.enable", {"timeDomain": "threadTicks"})
    yield started
    started.quit()


def asked_of_networks(browser: Any) -> set[str]:
    """Every address that was asked for since the log was last read, data within the page aside."""
    said = [json.loads(one["message"])["message"] for one in browser.get_log("performance")]
    asked = {one["params"]["request"]["url"] for one in said if one["method"] == "Network.requestWillBeSent"}
    return {url for url in asked if not url.startswith("data:")}


def overhang_px(browser: Any, width_mm: float) -> float:
    """By how much the widest table, or the page, is wider than the paper inside its margins."""
    browser.execute_cdp_cmd("Emulation.setEmulatedMedia", {"media": "print"})
    inside_px = (width_mm - MARGINS_MM) / 25.4 * 96
    size = {"width": int(inside_px), "height": 900, "deviceScaleFactor": 1, "mobile": False}
    browser.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", size)
    try:
        tables = browser.execute_script("return [...document.querySelectorAll('table')].map(t => t.scrollWidth)")
        assert tables
        page = browser.execute_script("return document.documentElement.scrollWidth")
        return float(max(*tables, page) - inside_px)
    finally:
        browser.execute_cdp_cmd("Emulation.clearDeviceMetricsOverride", {})
        browser.execute_cdp_cmd("Emulation.setEmulatedMedia", {"media": ""})


def colour(browser: Any, selector: str, what: str) -> list[int]:
    found = browser.execute_script(f"return getComputedStyle(document.querySelector('{selector}')).{what}")
    return [int(part) for part in re.findall(r"\d+", found)[:3]]


def contrast(one: list[int], other: list[int]) -> float:
    light, dark = sorted((luminance(one), luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


def luminance(rgb: list[int]) -> float:
    linear = [c / 255 / 12.92 if c / 255 <= 0.04045 else ((c / 255 + 0.055) / 1.055) ** 2.4 for c in rgb]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]
