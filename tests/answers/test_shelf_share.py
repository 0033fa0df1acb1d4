"""The shelf and the history give the same share, and none of a reference that saw nothing."""

from __future__ import annotations

from pathlib import Path

from electrolog.answers.calibrating import NewCalibration
from electrolog.answers.shelf import Filter
from electrolog.lab import open_lab


def test_no_share_of_a_reference_without_response(tmp_path: Path) -> None:
    lab = open_lab(str(tmp_path / "lab.db"), create=True)
    lab.make_probes(["P1"])
    flat, steep = ((0, 0.1), (1, 0.2), (2, 0.05), (3, 0.15)), ((0, 0.1), (1, 10.2), (2, 20.1), (3, 30.2))
    for at, points in (("2026-03-02T09:00Z", flat), ("2026-03-03T09:00Z", steep)):
        values = {"electrode": "P1", "at": at, "stage": "pre", "analyte": "DA", "waveform": "triangle"}
        lab.calibrate([NewCalibration(values, points)], confirmed=True)
    assert lab.shelf(Filter())[0].share_left is None
    assert lab.readings(["P1"])[-1].share_left is None
