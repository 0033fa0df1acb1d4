"""What makes a kept fit stale: what came to its own cohort, and every correction that bears on it, and nothing else."""

from __future__ import annotations

from collections.abc import Callable

import pytest

from electrolog.answers.calibrating import NewCalibration
from electrolog.lab import Lab
from electrolog.record import journal, kept_fits, seen_by_fit
from electrolog.record.names import Names
from electrolog.record.seen_by_fit import Seen, Since
from tests.record.conftest import POINTS, calibration

Change = Callable[[Lab], object]
NOW = "2026-02-02T09:00Z"


def seen_of(lab: Lab, analyte: str) -> Seen:
    with lab.record.reading() as connection:
        return seen_by_fit.to_be_seen(connection, Names(connection).row_id("analytes", analyte))


def since(lab: Lab, analyte: str, seen: Seen) -> Since:
    with lab.record.reading() as connection:
        return seen_by_fit.since(connection, Names(connection).row_id("analytes", analyte), seen)


def newest(lab: Lab) -> int:
    with lab.record.reading() as connection:
        return journal.head(connection)[0]


def serotonin(probe: str, at: str = NOW) -> NewCalibration:
    values = {"electrode": probe, "at": at, "stage": "pre", "analyte": "5-HT", "waveform": "triangle"}
    return NewCalibration(values, POINTS)


@pytest.fixture
def two_cohorts(lived_in: Lab) -> Lab:
    """B1-01 was calibrated with dopamine, B1-02 with serotonin, X1 with neither."""
    lived_in.make_probes(["X1"], batch={"batch": "X"})
    lived_in.calibrate([serotonin("B1-02")])
    run = {"duration_min": "1h", "setting": "slice"}
    for probe in ("B1-02", "X1"):
        lived_in.log("exposures", [probe], {"start": "2026-02-01T09:00Z", **run})
    return lived_in


def test_a_calibration_counts_for_its_own_cohort_alone(two_cohorts: Lab) -> None:
    seen = {analyte: seen_of(two_cohorts, analyte) for analyte in ("dopamine", "serotonin")}
    two_cohorts.calibrate([calibration("B1-02", "2026-02-03T09:00Z")], confirmed=True)
    assert since(two_cohorts, "dopamine", seen["dopamine"]) == Since(1, 0)
    assert since(two_cohorts, "serotonin", seen["serotonin"]) == Since(0, 0)


def amend(what: str, name: str, **values: str) -> Change:
    return lambda lab: lab.amend(what, name, values, "misread")


def strike(what: str, name: str) -> Change:
    return lambda lab: lab.strike(what, name, "never was")


@pytest.mark.parametrize(
    ("change", "dopamine", "serotonin"),
    [
        (amend("calibration", "C0001", medium="PBS"), True, False),
        (amend("calibration", "C0003", medium="PBS"), False, True),
        (amend("point", "C0001/2", current_na="3.3nA"), True, False),
        (strike("calibration", "C0002"), True, False),
        (strike("point", "C0003/2"), False, True),
        (amend("exposure", "1", duration_min="3h"), True, False),
        (amend("exposure", "2", duration_min="3h"), False, True),
        (amend("exposure", "3", duration_min="3h"), False, False),
        (strike("cleaning", "1"), True, False),
        (amend("standard", "S1", relative_uncertainty="5%"), True, False),
        (amend("probe", "B1-02", exposed_length_um="90um"), False, True),
        (amend("probe", "X1", exposed_length_um="90um"), False, False),
        (amend("batch", "B1", fibre="carbon fibre 5 um"), True, True),
        (amend("batch", "X", fibre="carbon fibre 5 um"), False, False),
        (amend("waveform", "triangle", frequency_hz="20Hz"), True, True),
    ],
)
def test_a_correction_counts_where_it_bears_on_the_cohort(
    two_cohorts: Lab, change: Change, dopamine: bool, serotonin: bool
) -> None:
    seen = {analyte: seen_of(two_cohorts, analyte) for analyte in ("dopamine", "serotonin")}
    change(two_cohorts)
    found = {analyte: since(two_cohorts, analyte, seen[analyte]).correction for analyte in seen}
    told = newest(two_cohorts)
    assert found == {"dopamine": told if dopamine else 0, "serotonin": told if serotonin else 0}


@pytest.mark.parametrize(
    "change",
    [amend("calibration", "C0001", analyte="5-HT", standard=""), amend("exposure", "1", electrode="X1")],
    ids=["to another analyte", "to another probe"],
)
def test_what_has_left_a_cohort_counts_there_too(two_cohorts: Lab, change: Change) -> None:
    seen = seen_of(two_cohorts, "dopamine")
    change(two_cohorts)
    assert since(two_cohorts, "dopamine", seen).correction == newest(two_cohorts)


def test_of_two_that_fitted_at_once_what_had_seen_more_is_kept(two_cohorts: Lab) -> None:
    early = seen_of(two_cohorts, "serotonin")
    two_cohorts.calibrate([serotonin("B1-02", "2026-02-03T09:00Z")], confirmed=True)
    late = seen_of(two_cohorts, "serotonin")
    corrected = Seen(late.readings - 1, early.newest, late.correction + 1)
    kept = []
    for seen in (late, early, late, corrected, late):
        with two_cohorts.record.writing() as writer:
            analyte_id = writer.names.row_id("analytes", "serotonin")
            fit = {"shared": {"of": seen.readings}, "units": {"B1-02": [seen.readings]}}
            kept_fits.keep_fit(writer, kept_fits.sealed(analyte_id, "a method", f"{seen}", seen, fit))
        with two_cohorts.record.reading() as connection:
            found = kept_fits.kept_fit(connection, analyte_id)
            assert found is not None
            told = kept_fits.content(connection, analyte_id)
            kept.append((found.seen, told["shared"]["of"], told["units"]["B1-02"]))
    assert kept == [(one, one.readings, [one.readings]) for one in (late, late, late, corrected, corrected)]
