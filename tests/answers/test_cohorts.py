"""What a fit is told of a probe's life: exposures cut at what falls into them, renewals, areas, days, groups."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest

from electrolog.answers import fits
from electrolog.answers.cohorts import Cohort
from electrolog.fouling.events import EXPOSURE, READING, RENEWAL
from electrolog.lab import Lab, open_lab

Points = tuple[tuple[float, float], ...]
POINTS: Points = ((0.0, 0.1), (0.5, 5.1), (1.0, 10.1), (2.0, 20.1))
SCATTERED: Points = ((0.0, 0.2), (0.5, 5.0), (1.0, 10.3), (2.0, 20.0))


@pytest.fixture
def lab(tmp_path: Path) -> Lab:
    made = open_lab(str(tmp_path / "lab.db"), create=True)
    made.make_probes(["P1"], batch={"batch": "B1", "fibre": "carbon fibre 7 um"}, probe={"exposed_length_um": "100um"})
    return made


def calibrate(
    lab: Lab,
    at: str,
    *,
    probe: str = "P1",
    stage: str = "pre",
    factor: float = 1.0,
    points: Points = POINTS,
    **more: str,
) -> None:
    from electrolog.answers.calibrating import NewCalibration

    values = {"electrode": probe, "at": at, "stage": stage, "analyte": "DA", "waveform": "triangle", **more}
    lab.calibrate([NewCalibration(values, [(c, i * factor) for c, i in points])], confirmed=True)


def expose(lab: Lab, start: str, hours: float, setting: str = "in-vivo") -> None:
    values = {"start": start, "duration_min": f"{hours}h", "setting": setting}
    lab.log("exposures", ["P1"], values, confirmed=True)


def gathered(lab: Lab) -> Cohort:
    with lab.record.reading() as connection:
        asked = fits.assay(connection, "DA", "triangle")
    return fits.gathered(lab.record, asked)[0]


def steps(cohort: Cohort) -> list[tuple[str, str, float]]:
    events = cohort.events
    names = {EXPOSURE: events.settings, RENEWAL: events.renewals, READING: events.days}
    words = {EXPOSURE: "exposure", RENEWAL: "renewal", READING: "reading"}
    return [
        (words[kind], names[kind][which], round(amount, 6))
        for kind, which, amount in zip(events.kind, events.which, events.amount, strict=True)
    ]


def test_a_reading_is_the_logarithm_of_the_sensitivity_with_its_relative_error(lab: Lab) -> None:
    calibrate(lab, "2026-03-02T09:00Z", standard="")
    cohort = gathered(lab)
    assert steps(cohort) == [("reading", "\n\n2026-03-02", round(math.log(10.0), 6))]
    assert math.isnan(cohort.events.se[0])  # no scatter tells nothing of the error
    assert cohort.left_out == {}
    calibrate(lab, "2026-03-03T09:00Z", points=SCATTERED)
    slope, covariance = np.polyfit(*np.transpose(SCATTERED), 1, cov="unscaled")
    residual = np.subtract([i for _, i in SCATTERED], np.polyval(slope, [c for c, _ in SCATTERED]))
    wanted = math.sqrt(residual @ residual / 2 * covariance[0, 0]) / slope[0]
    assert gathered(lab).events.se[1] == pytest.approx(wanted, rel=1e-9)


def test_an_exposure_is_cut_where_a_calibration_falls_into_it(lab: Lab) -> None:
    expose(lab, "2026-03-02T10:00Z", 4)
    calibrate(lab, "2026-03-02T11:00Z", stage="interim")
    found = [(kind, amount) for kind, _, amount in steps(gathered(lab))]
    assert [kind for kind, _ in found] == ["exposure", "reading", "exposure"]
    assert found[0][1] == pytest.approx(1.0)
    assert found[2][1] == pytest.approx(3.0)


def test_overlapping_exposures_each_count_and_are_cut_alike(lab: Lab) -> None:
    expose(lab, "2026-03-02T10:00Z", 4)
    expose(lab, "2026-03-02T11:00Z", 4, "slice")
    calibrate(lab, "2026-03-02T12:00Z", stage="interim")
    hours: dict[str, float] = {}
    for kind, name, amount in steps(gathered(lab)):
        if kind == "exposure":
            hours[name] = hours.get(name, 0.0) + amount
    assert hours == pytest.approx({"in-vivo": 4.0, "slice": 4.0})


def test_the_first_film_renews_nothing_and_a_later_one_does(lab: Lab) -> None:
    lab.log("coatings", ["P1"], {"at": "2026-03-01T09:00Z", "material": "PFSA"})
    calibrate(lab, "2026-03-02T09:00Z")
    lab.log("cleanings", ["P1"], {"at": "2026-03-03T09:00Z", "method": "isopropanol"})
    lab.log("coatings", ["P1"], {"at": "2026-03-04T09:00Z", "material": "PFSA"})
    assert [(kind, name) for kind, name, _ in steps(gathered(lab))] == [
        ("reading", "\n\n2026-03-02"),
        ("renewal", "clean:isopropanol"),
        ("renewal", "recoat"),
    ]


def test_a_recut_changes_the_area_by_what_was_measured(lab: Lab) -> None:
    calibrate(lab, "2026-03-02T09:00Z")
    lab.log("inspections", ["P1"], {"at": "2026-03-03T09:00Z", "exposed_length_um": "90um"})
    lab.log("recuts", ["P1"], {"at": "2026-03-04T09:00Z", "exposed_length_um": "60um"})
    lab.log("recuts", ["P1"], {"at": "2026-03-05T09:00Z"})
    areas = [amount for kind, _, amount in steps(gathered(lab)) if kind == "renewal"]
    assert areas == pytest.approx([math.log(60 / 90), 0.0], abs=1e-6)


def test_days_are_shared_by_standard_rig_and_date(lab: Lab) -> None:
    lab.make_probes(["P2"])
    for probe, rig in (("P1", "north"), ("P2", "north"), ("P2", "south")):
        calibrate(lab, "2026-03-02T09:00Z", probe=probe, rig=rig)
    assert gathered(lab).events.days == ("\nnorth\n2026-03-02", "\nsouth\n2026-03-02")


def test_what_has_no_logarithm_is_left_out_and_said(lab: Lab) -> None:
    calibrate(lab, "2026-03-02T09:00Z")
    calibrate(lab, "2026-03-03T09:00Z", factor=-1.0)
    cohort = gathered(lab)
    assert len([step for step in steps(cohort) if step[0] == "reading"]) == 1
    assert "no logarithm" in cohort.left_out["C0002"]


def test_groups_say_what_is_known_and_bare_is_a_coating_too(lab: Lab) -> None:
    lab.make_probes(["P2"])
    lab.log("coatings", ["P2"], {"at": "2026-03-01T09:00Z", "material": "PFSA"})
    for probe in ("P1", "P2"):
        calibrate(lab, "2026-03-02T09:00Z", probe=probe)
    groups = gathered(lab).events.groups
    assert groups["coating"] == ("none", "PFSA")
    assert groups["fibre"] == ("carbon fibre 7 um", "")
    assert groups["batch"] == ("B1", "")


def test_a_struck_calibration_is_no_reading(lab: Lab) -> None:
    calibrate(lab, "2026-03-02T09:00Z")
    calibrate(lab, "2026-03-03T09:00Z")
    lab.strike("calibration", "C0002", "wrong probe in the holder")
    assert len(gathered(lab).events.unit) == 1


def test_a_retired_probe_stays_in_the_cohort(lab: Lab) -> None:
    calibrate(lab, "2026-03-02T09:00Z")
    lab.log("retirements", ["P1"], {"at": "2026-03-03T09:00Z", "reason": "broken"})
    assert gathered(lab).units == (("P1", "triangle"),)
    assert np.isfinite(gathered(lab).events.amount).all()
