"""The shelf before a planned run, and the verdict where the question itself is odd."""

from __future__ import annotations

import html.parser
from pathlib import Path
from typing import Any

import pytest

from tests.cli.conftest import JUDGED_AT, Terminal

RUN = ("--analyte", "dopamine", "--waveform", "triangle", "--setting", "in-vivo", "--run", "2h")
SIGNS = {"fit": 0, "recalibrate": 10, "retire": 20, "undetermined": 30}


def verdict_of(judged: Terminal, probe: str, *more: str, run: tuple[str, ...] = RUN) -> dict[str, Any]:
    answer = judged("check", probe, *run, *more, "--json")
    assert answer.err == ""
    (found,) = answer.json
    assert answer.status == SIGNS[found["verdict"]]
    return dict(found)


def texts(found: dict[str, Any]) -> str:
    return " / ".join([*(reason["text"] for reason in found["reasons"]), *found["notes"]])


def test_the_best_probe_stands_first(judged: Terminal) -> None:
    probes = judged.ok("shelf", *RUN, "--json").json["probes"]
    assert len(probes) == 34
    words = [one["verdict"] for one in probes]
    assert words == sorted(words, key=["fit", "recalibrate", "undetermined", "retire"].index)
    odds = [one["p_breach"] for one in probes if one["verdict"] == "fit" and one["p_breach"] is not None]
    assert odds == sorted(odds)


def test_the_shelf_says_of_each_probe_what_a_check_says(judged: Terminal) -> None:
    ranked = {one["electrode"]: one for one in judged.ok("shelf", *RUN, "--json").json["probes"]}
    for alone in judged("check", "--all", *RUN, "--json").json:
        assert ranked[alone["electrode"]]["verdict"] == alone["verdict"]
        assert ranked[alone["electrode"]]["p_breach"] == pytest.approx(alone["p_breach"])


def test_a_retired_probe_is_not_on_the_shelf(judged: Terminal) -> None:
    judged.ok("retire", "R1", "-r", "broken", "--at", JUDGED_AT)
    assert "R1" not in [one["electrode"] for one in judged.ok("shelf", *RUN, "--json").json["probes"]]
    found = verdict_of(judged, "R1")
    assert found["verdict"] == "retire"
    assert "retired on" in texts(found)


def test_the_ranked_shelf_can_be_narrowed(judged: Terminal) -> None:
    found = judged.ok("shelf", *RUN, "--search", "rec-R1", "--json").json["probes"]
    assert [one["electrode"] for one in found] == ["R1"]


def test_a_run_told_by_halves_is_refused(judged: Terminal) -> None:
    said = judged.refused("shelf", "--run", "2h", "--analyte", "dopamine")
    assert "lacks --waveform, --setting" in said


def test_the_shelf_fits_a_narrow_terminal(judged: Terminal, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", "60")
    lines = judged.ok("shelf", *RUN).out.splitlines()
    assert max(len(line) for line in lines) <= 60
    assert "no room for" in " ".join(lines)


@pytest.mark.parametrize("length", ["0h", "-2h", "0"])
def test_a_run_of_nothing_is_refused(judged: Terminal, length: str) -> None:
    planned = (*RUN[:-1], length)
    for command in (("check", "R1"), ("shelf",), ("outlook",)):
        assert "longer than zero" in judged.refused(*command, *planned)


def test_a_setting_never_seen_gives_the_widest_answer_and_says_so(judged: Terminal) -> None:
    known = verdict_of(judged, "G1-1")
    unseen = verdict_of(judged, "G1-1", run=(*RUN[:5], "slice", *RUN[6:]))
    assert "nothing was ever logged in slice" in texts(unseen)
    assert "nothing was ever logged" not in texts(known)

    def width(found: dict[str, Any]) -> float:
        end, now = (found["sensitivity_na_um"][when] for when in ("end", "now"))
        return float((end["0.95"] - end["0.05"]) / (now["0.95"] - now["0.05"]))

    assert width(unseen) > width(known)


def test_a_probe_in_use_is_not_free(judged: Terminal) -> None:
    judged.ok("expose", "R1", "--for", "3h", "-s", "in-vivo", "--start", "30min ago")
    found = verdict_of(judged, "R1")
    assert found["verdict"] == "recalibrate"
    assert "in use right now, in in-vivo until" in texts(found)


def test_a_probe_not_yet_made_gets_no_verdict(judged: Terminal) -> None:
    judged.ok("new", "--batch", "B99", "--count", "1", "--made-on", "2026-12-24")
    found = verdict_of(judged, "B99-01")
    assert found["verdict"] == "undetermined"
    assert "isn't made yet" in texts(found)


def test_an_entry_from_the_future_is_laid_to_the_clocks(judged: Terminal) -> None:
    judged.ok("clean", "R1", "-m", "isopropanol", "--at", "2026-12-01T10:00Z", "--yes")
    found = verdict_of(judged, "R1")
    assert found["verdict"] == "undetermined"
    assert [reason["rule"] for reason in found["reasons"]] == ["clocks"]
    first = judged.ok("shelf", *RUN, "--json").json["probes"][-1]
    assert (first["electrode"], first["verdict"]) == ("R1", "undetermined")


def test_limits_that_contradict_each_other_give_no_verdict(judged: Terminal) -> None:
    judged.ok("limits", "set", "cost-of-wasted-run", "10")
    judged.ok("limits", "set", "cost-of-discarded-probe", "9")
    found = verdict_of(judged, "R1")
    assert found["verdict"] == "undetermined"
    assert "the two costs imply" in texts(found)
    assert "keep one of them" in judged.ok("limits").out


def test_a_probe_never_calibrated_with_it_is_to_be_calibrated(judged: Terminal) -> None:
    judged.ok("new", "N1")
    found = verdict_of(judged, "N1")
    assert found["verdict"] == "recalibrate"
    assert "never calibrated with dopamine and triangle" in texts(found)
    assert "rests on 0 calibrations of its own" in texts(found)


def test_a_film_never_seen_is_said(judged: Terminal) -> None:
    judged.ok("new", "N1")
    judged.ok("coat", "N1", "-m", "PFSA", "--at", "2h ago")
    assert "no probe coated with PFSA was ever calibrated with dopamine" in texts(verdict_of(judged, "N1"))


def test_a_projects_limits_hold_for_it_alone(judged: Terminal) -> None:
    judged.ok("limits", "set", "least-share-left", "99%", "--project", "Striatum")
    strict = verdict_of(judged, "G1-1", "--project", "striatum")
    assert "the limit is 99 %" in texts(strict)
    assert "the limit is 60 %" in texts(verdict_of(judged, "G1-1"))
    assert "the nearest known one is 'Striatum'" in judged.refused("check", "R1", *RUN, "--project", "Stratum")


def test_several_probes_stand_in_a_table_first(judged: Terminal) -> None:
    lines = judged("check", "R1,G1-1", *RUN).out.splitlines()
    assert lines[0].split() == ["probe", "verdict", "odds", "longest", "run"]
    assert [line.split()[0] for line in lines[2:4]] == ["R1", "G1-1"]
    assert lines[5].startswith("[")


class Tags(html.parser.HTMLParser):
    def __init__(self) -> None:
        super().__init__()
        self.tags: list[str] = []
        self.attributes: dict[str, str] = {}
        self.words: list[str] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append(tag)
        self.attributes |= {name: value or "" for name, value in attrs}

    def handle_data(self, data: str) -> None:
        self.words.append(data)


def test_the_page_holds_the_verdict_and_nothing_from_elsewhere(judged: Terminal, tmp_path: Path) -> None:
    judged.ok("new", "<script>alert(1)</script>")
    answer = judged("check", "R1", "<script>alert(1)</script>", *RUN, "--needs", "50nM", "--page", "rig.html")
    assert answer.err == ""
    page = (tmp_path / "rig.html").read_text(encoding="utf-8")
    read = Tags()
    read.feed(page)
    assert not {"script", "img", "link", "iframe", "object", "form"} & {*read.tags}
    assert not {"src", "href", "onclick", "style"} & {*read.attributes}
    assert "default-src 'none'" in page
    said = " ".join(" ".join(read.words).split())
    assert "<script>alert(1)</script>" in said
    for text in ("R1", "2 h in-vivo", "down to 50 nM", "biohazard", "least-share-left", "lab decision"):
        assert text in said
    assert "@page" in page


def test_the_pages_style_is_the_one_its_policy_allows(judged: Terminal, tmp_path: Path) -> None:
    import base64
    import hashlib

    judged("check", "R1", *RUN, "--page", "rig.html")
    page = (tmp_path / "rig.html").read_text(encoding="utf-8")
    style = page.partition("<style>")[2].partition("</style>")[0]
    digest = base64.b64encode(hashlib.sha256(style.encode()).digest()).decode()
    assert f"style-src 'sha256-{digest}'" in page


def test_the_page_says_from_which_state_of_the_journal_it_is(judged: Terminal, tmp_path: Path) -> None:
    judged("check", "R1", *RUN, "--page", "rig.html")
    head = judged.ok("verify", "--json").json["head"]
    assert f"head {head[:16]}" in (tmp_path / "rig.html").read_text(encoding="utf-8")


def test_a_page_that_can_not_be_written_is_a_refusal(judged: Terminal) -> None:
    assert "No such file" in judged.refused("check", "R1", *RUN, "--page", "nowhere/rig.html", status=1)


def test_a_run_of_a_year_is_judged_in_silence_and_a_longer_one_refused(judged: Terminal) -> None:
    answer = judged("check", "R1", *RUN[:-1], "8760h", "--needs", "50nM", "--limit", "widest-interval=50%")
    assert (answer.status, answer.err) == (10, "")
    assert "shorten" in answer.out
    assert "longer than a year" in judged.refused("check", "R1", *RUN[:-1], "8761h")


def test_a_sound_probe_that_sees_too_little_is_not_to_be_thrown_away(judged: Terminal) -> None:
    found = verdict_of(judged, "R1", "--needs", "1nM", "--limit", "least-share-left=20%")
    assert found["verdict"] == "retire"
    assert "for other runs it may still serve" in texts(found)
    assert "may still serve" not in texts(
        verdict_of(judged, "R1", "--needs", "1nM", "--limit", "least-share-left=100%")
    )


@pytest.mark.parametrize("typed", ["least-share-left", "=50%", "least-share-left="])
def test_a_limit_for_this_run_is_a_rule_and_a_value(judged: Terminal, typed: str) -> None:
    assert "accepted: RULE=VALUE" in judged.refused("check", "R1", *RUN, "--limit", typed)


def test_a_number_keeps_its_unit_beside_it(judged: Terminal, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", "48")
    lines = judged("check", "R1,G1-1", *RUN).out.splitlines()
    assert max(len(line) for line in lines) <= 48
    assert not [line for line in lines if line.split()[:1] in (["%"], ["h"], ["min"], ["µM"])]
