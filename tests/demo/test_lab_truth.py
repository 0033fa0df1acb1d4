"""What the invented lab's files say is what truth.toml states, seen through a bench's errors."""

from __future__ import annotations

import math
import statistics
from collections import Counter, defaultdict
from dataclasses import replace
from datetime import datetime
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest

Rows = dict[str, list[dict[str, str]]]


@pytest.fixture(scope="module")
def many_labs(demo: SimpleNamespace) -> list[Any]:
    return [demo.invented_lab(seed) for seed in range(20)]


def slopes(rows: Rows) -> dict[str, float]:
    points = defaultdict(list)
    for row in rows["calibration_points.csv"]:
        points[row["calibration"]].append((float(row["concentration_um"]), float(row["current_na"])))
    return {label: float(np.polyfit(*zip(*of, strict=True), 1)[0]) for label, of in points.items()}


def read_over_true(rows: Rows, lab: Any) -> dict[str, float]:
    return {c: s / lab.calibrations[c].true_sensitivity_na_um for c, s in slopes(rows).items()}


def test_only_the_bad_standard_and_the_slip_stand_far_from_the_truth(
    rows: Rows, lab: Any, demo: SimpleNamespace
) -> None:
    slip = demo.truth["slips"]["nanomolar_as_micromolar"]
    bad = demo.truth["standard"]["bad"]
    ratios = read_over_true(rows, lab)
    measured_with_bad = {row["calibration"] for row in rows["calibrations.csv"] if row["standard"] == bad}
    low = [ratios[label] for label in measured_with_bad]
    sound = [ratio for label, ratio in ratios.items() if label not in measured_with_bad | {slip}]
    assert statistics.fmean(low) == pytest.approx(0.82, abs=0.04)
    assert ratios[slip] == pytest.approx(1e-3, rel=0.2)
    assert statistics.median(sound) == pytest.approx(0.985, abs=0.01)  # midway between the rigs' gains
    assert statistics.stdev(math.log(ratio) for ratio in sound) == pytest.approx(0.04, abs=0.012)


def test_the_bad_standard_met_probes_that_other_standards_measured_too(rows: Rows, demo: SimpleNamespace) -> None:
    standards = defaultdict(set)
    for row in rows["calibrations.csv"]:
        standards[row["electrode"]].add(row["standard"])
    bad = demo.truth["standard"]["bad"]
    assert sum(bad in used and len(used) > 1 for used in standards.values()) >= 4


def test_nothing_in_the_record_gives_the_bad_standard_or_the_slip_away(rows: Rows, demo: SimpleNamespace) -> None:
    [bad] = [row for row in rows["standards.csv"] if row["standard"] == demo.truth["standard"]["bad"]]
    others = [row for row in rows["standards.csv"] if row["analyte"] == bad["analyte"] and row != bad]
    for column in ("concentration_um", "relative_uncertainty", "diluent", "note"):
        assert {bad[column]} == {row[column] for row in others}
    slip = demo.truth["slips"]["nanomolar_as_micromolar"]
    assert [row["note"] for row in rows["calibrations.csv"] if row["calibration"] == slip] == [""]


def test_dopamine_sensitivities_and_noise_are_in_the_range_the_trade_knows(rows: Rows, lab: Any) -> None:
    # 5 to 40 nA/µM and 0.05 to 0.2 nA: common practice
    first = {}
    for done in lab.calibrations.values():
        first.setdefault(done.row["electrode"], done)
    dopamine = [d.true_sensitivity_na_um for d in first.values() if d.row["analyte"] == "dopamine"]
    assert 5 < min(dopamine) < max(dopamine) < 40
    noise = [float(row["noise_na"]) for row in rows["calibrations.csv"]]
    assert 0.04 < min(noise) < max(noise) < 0.24


def renewed_probes(rows: Rows) -> set[str]:
    coated = Counter(row["electrode"] for row in rows["coatings.csv"])
    cleaned = {row["electrode"] for name in ("cleanings.csv", "recuts.csv") for row in rows[name]}
    return cleaned | {electrode for electrode, times in coated.items() if times > 1}


def test_the_true_loss_follows_from_the_files_and_the_stated_law(rows: Rows, lab: Any) -> None:
    """exp(−(rate · x)^0.8) with x = in-vivo hours + 0.35 slice hours + 0.02 flow-cell hours, where nothing renewed."""
    weight = {"in-vivo": 1.0, "slice": 0.35, "flow-cell": 0.02}
    renewed, checked = renewed_probes(rows), 0
    for done in lab.calibrations.values():
        label = done.row["electrode"]
        if label in renewed:
            continue
        before = [r for r in rows["exposures.csv"] if r["electrode"] == label]
        before = [r for r in before if datetime.fromisoformat(r["start"]) < done.at]
        x_h = sum(weight[r["setting"]] * float(r["duration_min"]) / 60 for r in before)
        probe = lab.probes[label]
        new = probe.level_na_um_per_1000_um2 * probe.area_um2 / 1000
        expected = new * math.exp(-((probe.rate_per_h * x_h) ** 0.8))
        assert done.true_sensitivity_na_um == pytest.approx(expected, rel=1e-9)
        checked += bool(before)
    assert checked > 20


@pytest.mark.parametrize("method", ["isopropanol", "extended triangle cycling", "re-coating", "re-cut"])
def test_a_renewal_gives_back_its_stated_share_of_the_log_loss(lab: Any, demo: SimpleNamespace, method: str) -> None:
    probe = replace(lab.probes["B01-01"], exposure_h=6.0)
    before = probe.log_loss
    probe.renew(method)
    assert probe.log_loss == pytest.approx(before * (1 - demo.truth["renewal"][method]), rel=1e-12)
    assert before > probe.log_loss > 0


def test_waveforms_and_coatings_foul_in_the_stated_order(many_labs: list[Any]) -> None:
    rates = defaultdict(list)
    for lab in many_labs:
        for probe in lab.probes.values():
            rates[probe.waveform, probe.coating].append(math.log(probe.rate_per_h))
    mean = {kind: statistics.fmean(of) for kind, of in rates.items()}
    for coating in ("uncoated", "PFSA", "PEDOT:PFSA"):
        slow, middle, fast = (mean[w, coating] for w in ("triangle", "serotonin-n-extended", "serotonin-n"))
        assert slow < middle < fast
    for waveform in ("triangle", "serotonin-n", "serotonin-n-extended"):
        assert mean[waveform, "PEDOT:PFSA"] < mean[waveform, "PFSA"] < mean[waveform, "uncoated"]


def test_probes_that_break_before_the_post_calibration_are_the_more_fouled(many_labs: list[Any]) -> None:
    broken, read = [], []
    for lab in many_labs:
        gone = {r["electrode"] for r in lab.tables["retirements"] if r["reason"] in ("broken", "lost")}
        broken += [lab.probes[label].log_loss for label in gone]
        posts = [done for done in lab.calibrations.values() if done.row["stage"] == "post"]
        read += [-math.log(done.true_sensitivity_na_um / as_new(lab, done)) for done in posts]
    assert statistics.fmean(broken) > 1.15 * statistics.fmean(read)


def as_new(lab: Any, done: Any) -> float:
    """What the probe would give unfouled, nA/µM, at the length it had when first calibrated."""
    first = next(c for c in lab.calibrations.values() if c.row["electrode"] == done.row["electrode"])
    return float(first.true_sensitivity_na_um)
