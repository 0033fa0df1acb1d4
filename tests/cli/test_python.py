"""The same lab from Python: the names that are promised, read only unless asked, answers as data frames, a notebook."""

from __future__ import annotations

import contextlib
import inspect
import io
import json
from pathlib import Path
from typing import Any

import pandas as pd
import pytest

import electrolog
from electrolog.lab import Lab

NOTEBOOK = Path(__file__).resolve().parents[2] / "demo" / "probes.ipynb"
PROMISED = {"DoubtfulEntry", "ElectrologError", "InputError", "Lab", "NewCalibration", "Run", "frame", "open_lab"}


def test_the_public_names_are_those_promised() -> None:
    assert set(electrolog.__all__) == PROMISED
    assert all(
        getattr(electrolog, name).__doc__ or issubclass(getattr(electrolog, name), Exception) for name in PROMISED
    )
    with pytest.raises(AttributeError, match="no attribute 'adopt'"):
        _ = electrolog.adopt


def test_every_question_of_a_lab_says_what_it_takes_and_gives() -> None:
    methods = [method for name, method in inspect.getmembers(Lab, inspect.isfunction) if not name.startswith("_")]
    assert len(methods) > 30
    for method in methods:
        assert "return" in method.__annotations__, method.__name__
        assert set(inspect.signature(method).parameters) - {"self"} <= set(method.__annotations__), method.__name__
    assert electrolog.frame.__annotations__["return"] == "pd.DataFrame"


def test_a_lab_is_read_only_unless_writing_is_asked_for(cli: Any) -> None:
    before = Path(cli.db).read_bytes()
    lab = electrolog.open_lab(cli.db)
    readings = lab.readings(["B07-01"])
    with pytest.raises(electrolog.ElectrologError, match="opened to be read only"):
        lab.log("cleanings", ["B07-01"], {"at": "2026-02-01T10:00Z", "method": "isopropanol"})
    assert Path(cli.db).read_bytes() == before
    writer = electrolog.open_lab(cli.db, write=True, who="wren")
    writer.log("cleanings", ["B07-01"], {"at": "2026-02-01T10:00Z", "method": "isopropanol"}, confirmed=True)
    assert writer.journal()[-1].who == "wren"
    assert [one.figures for one in lab.readings(["B07-01"])] == [one.figures for one in readings]


def test_a_reader_may_ask_for_a_verdict_and_keeps_nothing(judged: Any) -> None:
    lab = electrolog.open_lab(judged.db)
    kept = lab.verify().entries
    newest = electrolog.frame(lab.rows("calibrations")).sort_values("at").iloc[-1]
    run = electrolog.Run(newest["analyte"], newest["waveform"], "in-vivo", run_min=120)
    table = electrolog.frame(lab.check([newest["electrode"]], run))
    told = judged(
        "check", newest["electrode"], "-a", run.analyte, "-w", run.waveform, "-s", "in-vivo", "--run", "2h", "--json"
    )
    assert list(table["verdict.verdict"]) == [one["verdict"] for one in told.json]
    assert lab.verify().entries == kept


def test_answers_are_frames_with_their_units(cli: Any) -> None:
    lab = electrolog.open_lab(cli.db)
    readings = electrolog.frame(lab.readings(["B07-01"]))
    told = cli.ok("calibrations", "B07-01", "--json").json
    assert list(readings["figures.sensitivity_na_um"]) == [one["sensitivity_na_um"] for one in told]
    assert isinstance(readings["at"].dtype, pd.DatetimeTZDtype)
    points = electrolog.frame(lab.rows("calibration_points"))
    assert list(points.columns) == ["calibration", "concentration_um", "current_na"]
    assert points.groupby("calibration")["current_na"].max().loc["C0042"] == 24.0
    assert electrolog.frame([]).empty
    with pytest.raises(TypeError, match="int is no answer"):
        electrolog.frame([3])


def test_the_notebook_runs_from_top_to_bottom(judged: Any, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("ELECTROLOG_DB", judged.db)
    cells = json.loads(NOTEBOOK.read_text(encoding="utf-8"))["cells"]
    assert all(cell["outputs"] == [] for cell in cells if cell["cell_type"] == "code")
    names: dict[str, Any] = {}
    said = io.StringIO()
    with contextlib.redirect_stdout(said):
        for cell in cells:
            if cell["cell_type"] == "code":
                exec(compile("".join(cell["source"]), cell["id"], "exec"), names)  # noqa: S102
    assert "opened to be read only" in said.getvalue()
    assert set(names["checked"][0].verdict.verdict.split()) <= {"fit", "recalibrate", "retire", "undetermined"}
    assert len(names["calibrations"]) > 0
