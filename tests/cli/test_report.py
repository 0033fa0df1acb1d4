"""The report: everything asked for is in it, every text is escaped, and nothing in it comes from elsewhere."""

from __future__ import annotations

import base64
import hashlib
import re
from datetime import datetime, timedelta
from html.parser import HTMLParser
from pathlib import Path
from typing import Any

import pytest

HOSTILE = "<script>alert(1)</script><b>\"&'{{ 7*7 }}\x07"


class Page(HTMLParser):
    """Tags, attributes and text as a browser would read them."""

    def __init__(self, source: str) -> None:
        super().__init__()
        self.source = source
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.words: list[str] = []
        self.feed(source)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))

    def handle_data(self, data: str) -> None:
        self.words.append(data)

    @property
    def text(self) -> str:
        return " ".join(" ".join(self.words).split())

    def count(self, tag: str) -> int:
        return sum(name == tag for name, _ in self.tags)


def page_of(cli: Any, *arguments: str) -> Page:
    cli.ok("report", *arguments, "--out", "page.html")
    return Page(Path("page.html").read_text(encoding="utf-8"))


def test_a_probes_page_tells_its_whole_story(cli: Any) -> None:
    cli.ok("amend", "calibration", "C0050", "noise_na=0.07", "--why", "read off the wrong trace")
    page = page_of(cli, "B07-01")
    for words in (
        "Probe B07-01",
        "batch B07",
        "coating PFSA",
        "method isopropanol",
        "C0042",
        "C0050",
        "no longer: cleaning with isopropanol",
        "superseded",
        "read off the wrong trace",
        "noise_na unknown to 0.07",
        "No forecast: no fit of the cohort is at hand",
        "approved protocol and local rules come first",
    ):
        assert words in page.text, words
    assert page.count("article") == 1


def test_it_says_who_made_it_when_from_which_state_and_how(cli: Any) -> None:
    page = page_of(cli, "B07-01")
    head = cli.ok("verify", "--json").json
    assert f"journal at entry {head['entries']}, head {head['head'][:16]}" in page.text
    assert "calibration by line-" in page.text
    assert "with electrolog" in page.text
    assert str(Path(cli.db).parent) not in page.source


def test_a_planned_run_adds_the_verdict_and_the_forecast(judged: Any) -> None:
    run = ("--analyte", "DA", "--waveform", "triangle", "--setting", "in-vivo", "--run", "2h")
    page = page_of(judged, "R1", *run)
    (verdict,) = judged("check", "R1", *run, "--json").json
    assert f"{verdict['verdict']} ; odds of breaking a limit" in page.text
    assert "forecast in in-vivo, median" in page.text
    assert "The forecast as a table" in page.text
    points = judged.ok("calibrations", "R1", "--json").json[0]["points"]
    assert sum("nA" in title for title in titles(page)) >= len(points)


def titles(page: Page) -> list[str]:
    return re.findall(r"<title>([^<]*)</title></path>", page.source)


def test_the_labs_page_has_shelf_batches_cohort_and_days(judged: Any) -> None:
    page = page_of(judged, "--lab")
    shelf = judged.ok("shelf", "--state", "all", "--json").json
    assert page.source.count("<tr data-state=") == len(shelf)
    assert "How probes foul: dopamine" in page.text
    assert "suspicious days" in page.text
    assert "half-life in vivo" in page.text


def test_the_labs_week_names_verdicts(judged: Any) -> None:
    run = ("--analyte", "DA", "--waveform", "triangle", "--setting", "in-vivo", "--run", "2h")
    page = page_of(judged, "--lab", *run)
    assert "the verdict on every usable probe" in page.text
    assert "to make for" in page.text


def test_a_batch_is_each_of_its_probes(cli: Any) -> None:
    page = page_of(cli, "--batch", "b07")
    assert page.count("article") == 3
    assert "retired (broken)" in page.text


@pytest.mark.parametrize("arguments", [(), ("B07-01", "--lab"), ("--batch", "B07", "--lab")])
def test_a_report_is_of_one_thing(cli: Any, arguments: tuple[str, ...]) -> None:
    assert "a report of what?" in cli.refused("report", *arguments, "--out", "page.html")


def test_a_plan_is_its_runs_and_the_probes_that_serve_them(judged: Any) -> None:
    page = page_of(judged, "--run", str(a_plan(judged)))
    served = {one["electrode"] for one in judged.ok("assign", "week.csv", "--json").json["runs"]} - {None}
    assert served
    assert page.count("article") == len(served)
    assert "2 of 3 runs served" in page.text
    assert "run Long: no probe" in page.text
    assert re.search(r"for (Mon|Tue), [-0-9]+ [:0-9]+ ?[^:]*: 2 h in-vivo, DA, triangle", page.text)
    links = {a["href"] for tag, a in page.tags if tag == "a"}
    assert links <= {"#content", "#runs"} | {f"#{a['id']}" for tag, a in page.tags if tag == "article"}


def test_the_labs_page_takes_a_plan_too(judged: Any) -> None:
    page = page_of(judged, "--lab", "--run", str(a_plan(judged)))
    assert "Planned runs" in page.text
    assert page.count("article") == 0
    assert "<tr data-state=" in page.source


def a_plan(terminal: Any) -> Path:
    """Two runs that a probe can serve, one that none can; after the newest entry."""
    path = Path("week.csv")
    newest = max(one["last_calibration"] for one in terminal.ok("shelf", "--json").json if one["last_calibration"])
    first = datetime.fromisoformat(newest) + timedelta(days=400)
    starts = [(first + timedelta(days=day)).isoformat() for day in range(3)]
    rows = [f"Mon,{starts[0]},2h", f"Tue,{starts[1]},2h", f"Long,{starts[2]},900h"]
    head = "label,start,duration,analyte,waveform,setting\n"
    path.write_text(head + "".join(f"{row},DA,triangle,in-vivo\n" for row in rows), encoding="utf-8")
    return path


def test_a_plan_says_itself_what_its_runs_are_and_who_serves_them(judged: Any) -> None:
    path = str(a_plan(judged))
    for more in (("--analyte", "DA"), ("--needs", "50nM"), ("R1",), ("--batch", "B")):
        assert "plan" in judged.refused("report", *more, "--run", path, "--out", "page.html")
    assert "nowhere.csv" in judged.refused("report", "--run", "nowhere.csv", "--out", "page.html")
    assert not Path("page.html").exists()


def test_a_backtest_is_shown_once_it_was_made_and_how_to_make_it_before(judged: Any) -> None:
    before = page_of(judged, "--lab")
    assert "No backtest of dopamine: none has been made" in before.text
    assert "electrolog backtest --analyte dopamine" in before.text
    found = judged.ok("backtest", "-a", "DA", "--cuts", "1", "--json").json
    after = page_of(judged, "--lab")
    assert "Backtest: dopamine" in after.text
    assert f"{found['forecasts']} calibrations, each forecast from what was known before it" in after.text
    assert "90 % intervals held" in after.source
    assert [int(n) for n in re.findall(r"to [01]\.\d: (\d+) readings?, expected", after.source)] == (
        found["methods"][0]["pit_counts"]
    )


def test_a_backtest_is_the_labs(cli: Any) -> None:
    assert "accepted with --lab" in cli.refused("report", "B07-01", "--backtest", "--out", "page.html")
    assert "too little to test on" in page_of(cli, "--lab", "--backtest").text


def test_half_a_run_and_unknown_names_are_refused(cli: Any) -> None:
    assert "lacks --run" in cli.refused(
        "report", "--lab", "-a", "DA", "-w", "triangle", "-s", "slice", "--out", "page.html"
    )
    assert "B07" in cli.refused("report", "--batch", "B70", "--out", "page.html")
    assert "the nearest known one is" in cli.refused("report", "B07-10", "--out", "page.html")
    assert not Path("page.html").exists()


def test_a_folder_that_is_not_there_is_said_before_the_work(cli: Any) -> None:
    assert "the folder 'nowhere' isn't there" in cli.refused("report", "--lab", "--out", "nowhere/page.html")


def test_hostile_text_is_only_text(cli: Any) -> None:
    cli.ok("note", "B07-01", HOSTILE.replace("\x07", ""), "--at", "2026-01-21T09:00Z")
    cli.ok("new", "<img src=x onerror=alert(1)>")
    for arguments in (("B07-01",), ("--lab",), ("<img src=x onerror=alert(1)>",)):
        page = page_of(cli, *arguments)
        assert page.count("b") == 0
        assert page.count("img") == 0
        assert page.count("script") == 1  # our own
    assert "<script>alert(1)</script>" in page_of(cli, "B07-01").text
    assert "{{ 7*7 }}" in page_of(cli, "B07-01").text


def test_a_very_long_note_may_be_broken_anywhere(cli: Any) -> None:
    cli.ok("note", "B07-01", "x" * 5000, "--at", "2026-01-21T09:00Z")
    assert re.search(r'<td class="long">[^<]*x{5000}', page_of(cli, "B07-01").source)


def test_the_policy_allows_our_own_style_and_script_and_nothing_else(cli: Any) -> None:
    page = page_of(cli, "--lab")
    (policy,) = [a["content"] for tag, a in page.tags if tag == "meta" and "http-equiv" in a]
    assert policy is not None
    assert policy.startswith("default-src 'none'; ")
    for tag in ("style", "script"):
        (own,) = re.findall(rf"<{tag}>(.*?)</{tag}>", page.source, re.DOTALL)
        digest = base64.b64encode(hashlib.sha256(own.encode()).digest()).decode()
        assert f"{tag}-src 'sha256-{digest}'" in policy
    assert "unsafe" not in policy


def test_nothing_is_loaded_from_elsewhere_and_no_handler_stands_in_an_attribute(judged: Any) -> None:
    for arguments in (("R1",), ("--lab",)):
        page = page_of(judged, *arguments)
        links = [v for _, a in page.tags for k, v in a.items() if k in ("src", "href", "action", "xlink:href")]
        assert all(link is not None and link.startswith(("#", "data:,")) for link in links)
        assert not [k for _, a in page.tags for k in a if k.startswith("on") or k == "style"]


def test_a_probe_with_nothing_and_one_with_a_factor_alone_are_plain_sentences(judged: Any) -> None:
    judged.ok("new", "EMPTY")
    assert "No calibration yet." in page_of(judged, "EMPTY").text
    assert "No points were kept." in page_of(judged, "G0-0").text


def test_no_number_in_a_chart_is_endless_or_missing(judged: Any) -> None:
    for arguments in (("R1", "R2", "G0-0"), ("--lab",)):
        drawn = re.findall(r' d="([^"]*)"', page_of(judged, *arguments).source)
        assert drawn
        assert all(re.fullmatch(r"[MLHVAZmlhvaz0-9.,\- ]+", path) for path in drawn)


def test_every_chart_has_a_name_of_its_own(judged: Any) -> None:
    page = page_of(judged, "R1", "R2")
    ids = [a["id"] for _, a in page.tags if "id" in a]
    assert len(ids) == len(set(ids))
    drawn = [a["aria-labelledby"] for tag, a in page.tags if tag == "svg" and a.get("role") == "img"]
    assert drawn
    assert set(drawn) <= set(ids)
