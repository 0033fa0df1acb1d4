"""The kept backtest comes back as it was, for the record that was tested and for what has grown from it alone."""

from __future__ import annotations

from dataclasses import asdict, replace
from pathlib import Path

import numpy as np
import pytest

from electrolog.answers import kept_backtest
from electrolog.answers.backtesting import Backtest, Cut, Forecast
from electrolog.answers.kept_backtest import State
from electrolog.clock import utc_now
from electrolog.judge.backtest import FitVerdicts
from electrolog.lab import Lab, open_lab
from tests.show.known_backtest import backtest


def made(path: Path, label: str = "P1") -> Lab:
    lab = open_lab(str(path), create=True)
    lab.make_probes([label])
    return lab


def filled_in() -> Backtest:
    """Every part filled in."""
    now = utc_now()
    one = Forecast("P1", "triangle", "C1", now, now, 2, 10.0, 8.0, 9.5, 12.0, 0.6, 0.03)
    return replace(
        backtest(),
        cuts=(Cut(now, 3, 20, 5, True),),
        verdicts=FitVerdicts(9, 5, 1, 0.7, 0.01, 0.6),
        no_verdicts="",
        forecasts=(one,),
        notes=("a note",),
    )


def test_it_comes_back_as_it_was(tmp_path: Path) -> None:
    lab = made(tmp_path / "lab.db")
    assert kept_backtest.kept(lab.record, "dopamine") is None
    found = filled_in()
    kept_backtest.keep(lab.record, found, State.of(lab.record, "DA"))
    again = kept_backtest.kept(lab.record, "dopamine")
    assert again is not None
    np.testing.assert_equal(asdict(again.found), asdict(found))
    assert (again.calibrations_since, again.corrected_since) == (0, False)


def test_what_came_since_is_said(tmp_path: Path) -> None:
    lab = made(tmp_path / "lab.db")
    kept_backtest.keep(lab.record, filled_in(), State.of(lab.record, "DA"))
    values = {"calibration": "C1", "stage": "pre", "analyte": "DA", "waveform": "triangle", "at": "2026-01-05T09:00Z"}
    lab.log("calibrations", ["P1"], {**values, "sensitivity_na_um": "10"})
    grown = kept_backtest.kept(lab.record, "dopamine")
    assert grown is not None
    assert (grown.calibrations_since, grown.corrected_since) == (1, False)
    lab.amend("calibration", "C1", {"noise_na": "0.07"}, "misread")
    corrected = kept_backtest.kept(lab.record, "dopamine")
    assert corrected is not None
    assert corrected.corrected_since


def test_another_record_in_the_same_place_is_another(tmp_path: Path) -> None:
    path = tmp_path / "lab.db"
    lab = made(path)
    kept_backtest.keep(lab.record, filled_in(), State.of(lab.record, "DA"))
    lab.record.engine.dispose()
    for file in tmp_path.glob("lab.db*"):
        file.unlink()
    assert kept_backtest.kept(made(path, "P2").record, "dopamine") is None


@pytest.mark.parametrize("damage", [b"", b"{}", b"[1]", b'{"stamp": "other"}', b"\xff"])
def test_what_cannot_be_read_is_not_there(tmp_path: Path, damage: bytes, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("ELECTROLOG_CACHE", str(tmp_path / "cache"))
    lab = made(tmp_path / "lab.db")
    kept_backtest.keep(lab.record, filled_in(), State.of(lab.record, "DA"))
    (file,) = (tmp_path / "cache").glob("backtest-*.json")
    file.write_bytes(damage)
    assert kept_backtest.kept(lab.record, "dopamine") is None
