"""Adding rows: what is taken, what is refused, and that a refusal leaves nothing behind."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

from electrolog.answers.calibrating import NewCalibration
from electrolog.errors import InputError, UnknownName
from electrolog.lab import Lab
from electrolog.record import entry, sheets
from electrolog.record.names import Names


def test_a_numbered_batch_goes_on_where_it_ended(lab: Lab) -> None:
    assert lab.make_probes(count=2, batch={"batch": "B9"}) == ["B9-01", "B9-02"]
    assert lab.make_probes(count=2, batch={"batch": "b9"}) == ["B9-03", "B9-04"]
    assert {row["batch"] for row in lab.rows("batches")} == {"B9"}


@pytest.mark.parametrize("count", [0, -1, 10_001])
def test_a_count_that_makes_no_sense_is_refused(lab: Lab, count: int) -> None:
    with pytest.raises(InputError, match="out of range"):
        lab.make_probes(count=count, batch={"batch": "B9"})
    assert lab.rows("batches") == []


def test_labels_and_a_count_together_are_refused(lab: Lab) -> None:
    with pytest.raises(InputError, match="which probes"):
        lab.make_probes(["P1"], count=3, batch={"batch": "B9"})
    with pytest.raises(InputError, match="which probes"):
        lab.make_probes(count=3)


@pytest.mark.parametrize(("there", "typed"), [("P1", "p1"), ("Élan-1", "éLAN-1"), ("Straße", "STRASSE")])
def test_a_label_that_differs_by_case_alone_is_refused(lab: Lab, there: str, typed: str) -> None:
    lab.make_probes([there])
    with pytest.raises(InputError, match="can't be told from"):
        lab.make_probes([typed])
    assert lab.labels([typed]) == [there]


def test_the_same_label_twice_is_refused(lived_in: Lab) -> None:
    with pytest.raises(InputError, match="probe 'B1-01' is there already"):
        lived_in.make_probes(["B1-01"])
    with pytest.raises(InputError, match="retirement 1 is there already"):
        lived_in.log("retirements", ["B1-01"], {"at": "now", "reason": "lost"}, confirmed=True)


def test_a_batch_is_not_changed_by_the_way(lived_in: Lab) -> None:
    with pytest.raises(InputError, match="this says more of it \\(made_by\\)"):
        lived_in.make_probes(count=1, batch={"batch": "B1", "made_by": "finch"})
    assert lived_in.make_probes(count=1, batch={"batch": "B1"}) == ["B1-03"]


@pytest.mark.parametrize("word", ["In-Vivo", "SLICE"])
def test_a_word_that_is_there_already_is_refused(lab: Lab, word: str) -> None:
    with pytest.raises(InputError, match="can't be told from"):
        lab.log_plain("terms", {"kind": "setting", "term": word})


@pytest.mark.parametrize(
    "values",
    [
        {"analyte": "dopamine hydrochloride", "abbreviation": "DA"},
        {"analyte": "da"},
        {"analyte": "new", "abbreviation": "Serotonin"},
    ],
)
def test_an_analytes_names_are_its_own(shared: Lab, values: dict[str, str]) -> None:
    with pytest.raises(InputError, match="another analyte"):
        shared.log_plain("analytes", values)
    with pytest.raises(InputError, match="another analyte"):
        shared.amend("analyte", "histamine", {name: values[name] for name in list(values)[-1:]}, "shorter")


def test_an_analyte_may_keep_its_names(lived_in: Lab) -> None:
    lived_in.amend("analyte", "HA", {"abbreviation": "HIS"}, "as the lab says")
    lived_in.amend("analyte", "his", {"note": "keeps"}, "a remark")
    histamine = next(row for row in lived_in.rows("analytes") if row["analyte"] == "histamine")
    assert (histamine["abbreviation"], histamine["note"]) == ("HIS", "keeps")


def test_a_word_may_stand_in_two_lists(lab: Lab) -> None:
    lab.log_plain("terms", {"kind": "medium", "term": "slice"})
    assert "slice" in lab.words("medium")


def test_one_of_several_probes_unknown_logs_none(lived_in: Lab) -> None:
    before = lived_in.verify().entries
    with pytest.raises(UnknownName, match="'B1-09'"):
        lived_in.log("cleanings", ["B1-02", "B1-09"], {"at": "now", "method": "acetone"})
    assert lived_in.verify().entries == before


def test_points_belong_to_one_probe(lived_in: Lab, calibrating: Callable[..., NewCalibration]) -> None:
    with pytest.raises(InputError, match="names 2 probes"):
        lived_in.calibrate([calibrating("B1-01,B1-02", "2026-02-01T10:00Z")])


def test_several_calibrations_are_all_written_or_none(
    lived_in: Lab, calibrating: Callable[..., NewCalibration]
) -> None:
    good, bad = calibrating("B1-02", "2026-02-01T10:00Z"), calibrating("B1-02", "2026-02-01T11:00Z", waveform="none")
    before = lived_in.verify().entries
    with pytest.raises(UnknownName, match="waveform"):
        lived_in.calibrate([good, bad])
    assert lived_in.verify().entries == before
    assert lived_in.readings(["B1-02"]) == []


def test_a_calibration_gets_the_next_free_label(lived_in: Lab, calibrating: Callable[..., NewCalibration]) -> None:
    (own,) = lived_in.calibrate([calibrating("B1-02", "2026-02-01T10:00Z", calibration="C0004")])
    alike = [calibrating("B1-02", f"2026-02-01T1{hour}:00Z") for hour in (1, 2)]
    made = lived_in.calibrate(alike, confirmed=True)
    assert own.values["calibration"] == "C0004"
    assert [one.values["calibration"] for one in made] == ["C0005", "C0006"]


def test_one_label_for_two_calibrations_is_refused(lived_in: Lab, calibrating: Callable[..., NewCalibration]) -> None:
    with pytest.raises(InputError, match="'X1'"):
        lived_in.calibrate([calibrating("B1-02", f"2026-02-01T1{hour}:00Z", calibration="X1") for hour in (1, 2)])


def test_raw_points_keep_their_order_and_their_replicates(lived_in: Lab) -> None:
    (first, _) = lived_in.readings(["B1-01"])
    assert first.points == ((0.0, 0.1), (0.25, 3.2), (0.5, 6.1), (0.5, 6.3), (1.0, 12.2), (2.0, 24.0))


@pytest.mark.parametrize(
    ("values", "said"),
    [
        ({"sensitivity_na_um": "12"}, "refused where points exist"),
        ({"sensitivity_se_na_um": "1"}, "without its sensitivity"),
        ({"noise_na": "-1"}, "out of range"),
        ({"temperature_c": "300C"}, "out of range"),
        ({"stage": "middle"}, "accepted: pre, interim, post"),
        ({"standard": "S9"}, "no standard"),
        ({"nonsense": "1"}, "no column"),
        ({"calibration": "x" * 201}, "too many"),
        ({"note": "a\0b"}, "NUL"),
        ({"note": "a\ud800b"}, "UTF-8"),
        ({"rig": "a\nb"}, "control character"),
        ({"analyte": ""}, "missing"),
    ],
)
def test_a_calibration_that_cannot_be_is_refused(
    shared: Lab, calibrating: Callable[..., NewCalibration], values: dict[str, Any], said: str
) -> None:
    before = shared.verify().entries
    with pytest.raises(InputError, match=said):
        shared.calibrate([calibrating("B1-02", "2026-02-01T10:00Z", **values)])
    assert shared.verify().entries == before


def test_a_standard_is_not_used_up_before_it_is_made(shared: Lab) -> None:
    made = {"standard": "S9", "analyte": "DA", "concentration_um": "10mM", "prepared_at": "2026-02-01T10:00Z"}
    with pytest.raises(InputError, match="lies before prepared_at"):
        shared.log_plain("standards", {**made, "expires_at": "2026-01-01T10:00Z"})


@pytest.mark.parametrize("text", ["[a12] ok [/]", "\x1b[31mred\x07", "🧪 é ש\u200f", "line\nline\ttab", "x" * 10_000])
def test_any_text_comes_back_as_it_was_typed(lived_in: Lab, text: str) -> None:
    lived_in.log("inspections", ["B1-02"], {"at": "2026-02-01T10:00Z", "note": text})
    _, events = lived_in.life("B1-02")
    assert events[-1].row["note"] == text
    assert lived_in.verify().whole


def test_a_column_that_no_sheet_has_is_refused(shared: Lab) -> None:
    with shared.record.reading() as connection:
        names = Names(connection)
        with pytest.raises(UnknownName, match="nearest known one is 'batch'"):
            entry.resolved(sheets.BATCHES, {"bach": "B1"}, names)


def test_numbers_come_back_as_they_were(lived_in: Lab, calibrating: Callable[..., NewCalibration]) -> None:
    points = [(0.0, -1e-12), (0.1 + 0.2, 1 / 3), (1e6, 12345.678901234567)]
    lived_in.calibrate([calibrating("B1-02", "2026-02-01T10:00Z", points=points)])
    assert lived_in.readings(["B1-02"])[0].points == tuple(points)
