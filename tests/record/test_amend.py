"""Corrections: the old value, who, when and why are kept; what others rest on can't be taken away."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

from electrolog.answers.calibrating import NewCalibration
from electrolog.errors import DoubtfulEntry, InputError, UnknownName
from electrolog.lab import Lab, open_lab


def newest(lab: Lab) -> Any:
    return lab.journal()[-1]


def test_an_amendment_keeps_the_old_value_who_when_and_why(lived_in: Lab) -> None:
    done = lived_in.amend("exposure", "1", {"duration_min": "3h", "medium": "saline"}, "typed wrong")
    assert done.changes == {"duration_min": (240.0, 180.0), "medium": (None, "saline")}
    entry = newest(lived_in)
    assert (entry.action, entry.sheet, entry.row_id, entry.who) == ("amend", "exposures", 1, "wren")
    assert entry.reason == "typed wrong"
    assert entry.change["before"] == {"duration_min": 240.0, "medium": None}
    assert entry.change["after"] == {"duration_min": 180.0, "medium": "saline"}
    assert lived_in.verify().whole


def test_an_empty_value_makes_it_unknown(lived_in: Lab) -> None:
    done = lived_in.amend("calibration", "C0001", {"standard": ""}, "no such vial")
    assert done.changes == {"standard": ("S1", None)}


def test_a_link_is_amended_by_name(lived_in: Lab) -> None:
    done = lived_in.amend("calibration", "C0002", {"electrode": "b1-02"}, "wrong probe in the holder")
    assert done.changes["electrode"][0] == "B1-01"
    assert [one.calibration for one in lived_in.readings(["B1-02"])] == ["C0002"]


@pytest.mark.parametrize(
    ("what", "name", "change"),
    [
        ("probe", "B1-02", {"electrode": "B1-07"}),
        ("electrode", "B1-02", {"note": "chipped"}),
        ("batch", "b1", {"made_by": "finch"}),
        ("standard", "S1", {"relative_uncertainty": "5%"}),
        ("coating", "1", {"material": "pedot"}),
        ("re-cut", "1", {"exposed_length_um": "0.08mm"}),
        ("point", "C0001/3", {"current_na": "6.2"}),
        ("waveform", "triangle", {"frequency_hz": "20Hz"}),
        ("word", "brain phantom", {"meaning": "agar"}),
        ("word", "setting/brain phantom", {"term": "phantom"}),
        ("retirement", "1", {"reason": "broken"}),
    ],
)
def test_every_kind_of_row_can_be_amended(lived_in: Lab, what: str, name: str, change: dict[str, str]) -> None:
    lived_in.amend(what, name, change, "because")
    assert newest(lived_in).action == "amend"
    assert lived_in.verify().whole


@pytest.mark.parametrize(
    ("what", "name", "change", "said"),
    [
        ("exposure", "1", {"duration_min": ""}, "missing; an exposure needs it"),
        ("exposure", "1", {"duration_min": "-1"}, "out of range"),
        ("exposure", "1", {"duration_min": "4h"}, "nothing to amend"),
        ("exposure", "1", {"setting": "brain"}, "no setting"),
        ("exposure", "1", {"nonsense": "1"}, "no column"),
        ("exposure", "99", {"note": "x"}, "no exposure has the number"),
        ("exposure", "x", {"note": "x"}, "no exposure has the number"),
        ("exposures?", "1", {"note": "x"}, "no kind of row"),
        ("probe", "B1-09", {"note": "x"}, "no probe"),
        ("probe", "B1-01", {"electrode": "B1-02"}, "is there already"),
        ("probe", "B1-01", {"electrode": "b1-02"}, "can't be told from"),
        ("calibration", "C0002", {"calibration": "c0001"}, "can't be told from"),
        ("calibration", "C0001", {"sensitivity_na_um": "12"}, "refused where points exist"),
        ("point", "C0001/99", {"current_na": "1"}, "no point number 99"),
        ("point", "C0001", {"current_na": "1"}, "names no point"),
        ("point", "C0001/0", {"current_na": "1"}, "names no point"),
        ("point", "C0001/1", {"calibration": "C0002"}, "stays with its calibration"),
        ("point", "C0001/1", {"concentration_um": "-1"}, "out of range"),
        ("word", "in-vivo", {"term": "brain"}, "no word of the lab's own"),
    ],
)
def test_an_amendment_that_cannot_be_is_refused(
    shared: Lab, what: str, name: str, change: dict[str, str], said: str
) -> None:
    before = shared.verify()
    with pytest.raises(InputError, match=said):
        shared.amend(what, name, change, "because")
    assert shared.verify() == before


@pytest.mark.parametrize("reason", ["", "   "])
def test_a_correction_needs_its_reason(shared: Lab, reason: str) -> None:
    with pytest.raises(InputError, match="needs its reason"):
        shared.amend("exposure", "1", {"duration_min": "3h"}, reason)
    with pytest.raises(InputError, match="needs its reason"):
        shared.strike("exposure", "1", reason)


@pytest.mark.parametrize(("reason", "said"), [("a\0b", "NUL"), ("a\ud800", "UTF-8"), ("x" * 100_001, "too many")])
def test_a_reason_is_text_like_any_other(shared: Lab, reason: str, said: str) -> None:
    with pytest.raises(InputError, match=said):
        shared.amend("exposure", "1", {"duration_min": "3h"}, reason)


def test_a_case_of_its_own_label_can_be_amended(lived_in: Lab) -> None:
    lived_in.amend("probe", "B1-02", {"electrode": "b1-02"}, "as engraved")
    assert lived_in.labels(["B1-02"]) == ["b1-02"]


def test_a_struck_row_is_out_of_every_answer_and_still_there(lived_in: Lab, raw: Callable[..., Any]) -> None:
    lived_in.strike("exposure", "1", "logged twice")
    _, events = lived_in.life("B1-01")
    assert "exposures" not in {event.sheet.name for event in events}
    ((struck,),) = raw(lived_in, "SELECT struck FROM exposures WHERE id = 1")
    entry = newest(lived_in)
    assert (entry.seq, entry.action, entry.change["before"]["duration_min"]) == (struck, "strike", 240.0)
    assert lived_in.verify().whole
    with pytest.raises(InputError, match="was struck"):
        lived_in.amend("exposure", "1", {"duration_min": "3h"}, "late")
    with pytest.raises(InputError, match="was struck"):
        lived_in.strike("exposure", "1", "again")


def test_a_struck_rows_key_can_be_used_again(
    lived_in: Lab, calibrating: Callable[..., NewCalibration], raw: Callable[..., Any]
) -> None:
    lived_in.strike("calibration", "C0002", "wrong probe")
    lived_in.calibrate([calibrating("B1-02", "2026-01-08T15:00Z", "post", calibration="C0002")], confirmed=True)
    assert [one.calibration for one in lived_in.readings(["B1-01"])] == ["C0001"]
    assert [one.calibration for one in lived_in.readings(["B1-02"])] == ["C0002"]
    assert raw(lived_in, "SELECT count(*) FROM calibration_points") == [(18,)]
    assert lived_in.verify().whole


@pytest.mark.parametrize(
    ("what", "name", "said"),
    [
        ("probe", "B1-01", "rest on this probe"),
        ("batch", "B1", "2 electrodes rest on this batch"),
        ("standard", "S1", "1 calibrations rest on this standard"),
        ("waveform", "triangle", "built-in"),
        ("analyte", "DA", "built-in"),
    ],
)
def test_what_others_rest_on_cannot_be_struck(shared: Lab, what: str, name: str, said: str) -> None:
    before = shared.verify()
    with pytest.raises(InputError, match=said):
        shared.strike(what, name, "because")
    assert shared.verify() == before


def test_a_word_in_use_is_neither_struck_nor_renamed(lived_in: Lab) -> None:
    run = {"start": "2026-02-01T10:00Z", "duration_min": "1h", "setting": "Brain Phantom"}
    lived_in.log("exposures", ["B1-02"], run)
    with pytest.raises(InputError, match="1 exposures use this word"):
        lived_in.strike("word", "brain phantom", "unused")
    with pytest.raises(InputError, match="1 exposures use this word"):
        lived_in.amend("word", "brain phantom", {"term": "agar"}, "shorter")
    lived_in.strike("exposure", "2", "never happened")
    lived_in.strike("word", "brain phantom", "unused")
    assert "brain phantom" not in lived_in.words("setting")


def test_a_word_of_two_lists_is_named_with_its_list(lived_in: Lab) -> None:
    lived_in.log_plain("terms", {"kind": "medium", "term": "brain phantom"})
    with pytest.raises(InputError, match="stands in 2 lists"):
        lived_in.strike("word", "brain phantom", "twice")
    lived_in.strike("word", "medium/brain phantom", "twice")
    assert "brain phantom" in lived_in.words("setting")


def test_a_struck_point_leaves_its_calibration(lived_in: Lab, raw: Callable[..., Any]) -> None:
    lived_in.strike("point", "C0001/6", "bubble")
    (first, _) = lived_in.readings(["B1-01"])
    assert len(first.points) == 5
    assert first.figures.n_points == 5
    assert raw(lived_in, "SELECT count(*) FROM calibration_points WHERE calibration_id = 1") == [(6,)]
    assert lived_in.verify().whole


def test_names_unknown_are_answered_with_the_nearest(shared: Lab) -> None:
    with pytest.raises(UnknownName, match="nearest known one is 'C0001'"):
        shared.amend("calibration", "C001", {"note": "x"}, "because")


# --- two people at the same entry ---------------------------------------------------------------------------------


def second_person(lab: Lab) -> Lab:
    return open_lab(lab.record.engine.url.render_as_string(False), who="finch")


def test_the_second_to_amend_an_entry_is_told_what_the_first_did(lived_in: Lab) -> None:
    lived_in.amend("exposure", "1", {"duration_min": "3h"}, "typed wrong")
    second = second_person(lived_in)
    with pytest.raises(DoubtfulEntry) as told:
        second.amend("exposure", "1", {"duration_min": "2h"}, "read off the log")
    assert "wren changed duration_min from 240.0 to 180.0" in told.value.doubts[0]
    assert "typed wrong" in told.value.message
    done = second.amend("exposure", "1", {"duration_min": "2h"}, "read off the log", confirmed=True)
    assert done.changes == {"duration_min": (180.0, 120.0)}
    assert lived_in.verify().whole


def test_of_a_point_too(lived_in: Lab) -> None:
    lived_in.amend("point", "C0001/3", {"current_na": "6.2"}, "misread")
    second = second_person(lived_in)
    second.amend("point", "C0001/4", {"current_na": "6.2"}, "another point is another matter")
    with pytest.raises(DoubtfulEntry, match=r"wren changed current_na from 6\.1 to 6\.2"):
        second.amend("point", "C0001/3", {"current_na": "6.4"}, "misread")


def test_other_columns_and_own_second_thoughts_are_no_matter(lived_in: Lab) -> None:
    lived_in.amend("exposure", "1", {"duration_min": "3h"}, "typed wrong")
    assert lived_in.amend("exposure", "1", {"duration_min": "2h"}, "once more").changes
    assert second_person(lived_in).amend("exposure", "1", {"note": "left arm"}, "forgotten").changes


def test_what_was_amended_long_ago_is_no_matter(lived_in: Lab, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("ELECTROLOG_NOW", "2026-02-01T00:00:00Z")
    lived_in.amend("exposure", "1", {"duration_min": "3h"}, "typed wrong")
    monkeypatch.setenv("ELECTROLOG_NOW", "2026-02-03T00:00:00Z")
    assert second_person(lived_in).amend("exposure", "1", {"duration_min": "2h"}, "read off the log").changes


def test_who_struck_an_entry_is_told(lived_in: Lab) -> None:
    lived_in.strike("cleaning", "1", "never happened")
    with pytest.raises(InputError, match=r"struck .*by wren at .*: never happened"):
        second_person(lived_in).amend("cleaning", "1", {"duration_min": "5min"}, "read off the log")
