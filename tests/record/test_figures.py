"""Figures are kept beside the raw points and made again whenever what they rest on is corrected."""

from __future__ import annotations

import json
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from electrolog.lab import Lab
from electrolog.measure.version import METHOD

C1 = np.array([0.0, 0.25, 0.5, 0.5, 1.0, 2.0])
I1 = np.array([0.1, 3.2, 6.1, 6.3, 12.2, 24.0])


def kept(raw: Callable[..., Any], lab: Lab, number: int) -> dict[str, Any]:
    ((method, figures),) = raw(
        lab, "SELECT method, figures FROM calibration_figures WHERE calibration_id = :n", n=number
    )
    assert method == METHOD
    answer: dict[str, Any] = json.loads(figures)
    return answer


def slope(concentration: Any, current: Any) -> float:
    return float(np.polyfit(concentration, current, 1)[0])


def test_figures_are_kept_at_entry(shared: Lab, raw: Callable[..., Any]) -> None:
    assert kept(raw, shared, 1)["sensitivity_na_um"] == pytest.approx(slope(C1, I1), rel=1e-12)


def test_an_amended_point_makes_them_anew(lived_in: Lab, raw: Callable[..., Any]) -> None:
    lived_in.amend("point", "C0001/6", {"current_na": "25"}, "misread")
    moved = I1.copy()
    moved[5] = 25
    assert kept(raw, lived_in, 1)["sensitivity_na_um"] == pytest.approx(slope(C1, moved), rel=1e-12)


def test_a_struck_point_makes_them_anew(lived_in: Lab, raw: Callable[..., Any]) -> None:
    lived_in.strike("point", "C0001/6", "bubble")
    assert kept(raw, lived_in, 1)["sensitivity_na_um"] == pytest.approx(slope(C1[:5], I1[:5]), rel=1e-12)


def test_amended_noise_makes_the_detection_limit_anew(lived_in: Lab, raw: Callable[..., Any]) -> None:
    before = kept(raw, lived_in, 1)["lod_um"]
    lived_in.amend("calibration", "C0001", {"noise_na": "160pA"}, "read the wrong trace")
    assert kept(raw, lived_in, 1)["lod_um"] == pytest.approx(2 * before, rel=1e-9)


def test_an_amended_standard_reaches_its_calibrations(lived_in: Lab, raw: Callable[..., Any]) -> None:
    before = kept(raw, lived_in, 1)
    lived_in.amend("standard", "S1", {"relative_uncertainty": "10%"}, "the balance")
    after = kept(raw, lived_in, 1)
    assert after["sensitivity_na_um"] == before["sensitivity_na_um"]
    assert after["sensitivity_se_shared_na_um"] == pytest.approx(5 * before["sensitivity_se_shared_na_um"], rel=1e-9)
    assert kept(raw, lived_in, 2)["sensitivity_se_shared_na_um"] is None


def test_recompute_finds_nothing_where_nothing_changed(lived_in: Lab) -> None:
    assert lived_in.recompute() == []


def test_recompute_replaces_what_an_older_method_made(lived_in: Lab, raw: Callable[..., Any]) -> None:
    old = json.dumps({**kept(raw, lived_in, 1), "method": "line-0", "sensitivity_na_um": 1.5})
    raw(lived_in, "UPDATE calibration_figures SET figures = :old, method = 'line-0' WHERE calibration_id = 1", old=old)
    assert lived_in.readings(["B1-01"])[0].figures.sensitivity_na_um == pytest.approx(slope(C1, I1), rel=1e-12)
    (changed,) = lived_in.recompute()
    assert (changed.calibration, changed.sensitivity_na_um_before, changed.method_before) == ("C0001", 1.5, "line-0")
    assert kept(raw, lived_in, 1)["sensitivity_na_um"] == pytest.approx(slope(C1, I1), rel=1e-12)


def test_raw_points_are_never_dropped(lived_in: Lab, raw: Callable[..., Any]) -> None:
    everything = "SELECT calibration_id, ordinal, concentration_um FROM calibration_points ORDER BY 1, 2"
    before = raw(lived_in, everything)
    lived_in.recompute()
    lived_in.amend("point", "C0001/1", {"current_na": "0.2"}, "misread")
    lived_in.strike("point", "C0001/2", "bubble")
    lived_in.strike("calibration", "C0002", "wrong probe")
    assert raw(lived_in, everything) == before
