"""The same lab from Python: the names that are promised, read only unless asked, answers as data frames, a notebook."""

from __future__ import annotations

import contextlib
import inspect
import io
import json
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from matplotlib.figure import Figure

import electrolog
from electrolog.answers.controlling import Wanted
from electrolog.answers.kinds import By
from electrolog.answers.quantities import Quantity
from electrolog.lab import Lab
from tests.measure import recordings

NOTEBOOK = Path(__file__).resolve().parents[2] / "demo" / "probes.ipynb"
PROMISED = {
    *("DoubtfulEntry", "ElectrologError", "InputError", "Lab", "NewCalibration", "Run", "draw", "frame", "open_lab"),
}
DRAWN = {
    *("calibration", "cusum", "days", "ewma", "fan", "history", "individuals", "moving_range", "pit", "reliability"),
    *("residuals", "scan_trace", "sheet", "spread", "survival", "trace", "voltammograms"),
}


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


def test_the_figures_are_those_promised_and_each_takes_and_gives_an_axes() -> None:
    assert set(electrolog.draw.__all__) == DRAWN
    for name in DRAWN:
        figure = getattr(electrolog.draw, name)
        parameters = list(inspect.signature(figure).parameters.values())
        assert (parameters[-1].name, parameters[-1].default) == ("axes", None), name
        assert (parameters[-1].annotation, figure.__annotations__["return"]) == ("Axes | None", "Axes"), name


def test_answers_are_drawn_on_the_axes_given(judged: Any) -> None:
    lab = electrolog.open_lab(judged.db, write=True)
    coated = [f"G{group}-{k}" for group in range(4) for k in range(4)]
    lab.log("coatings", coated, {"at": "2026-01-04T12:00Z", "material": "PFSA"}, confirmed=True)
    analyte, waveform = "dopamine", "triangle"
    reading = next(one for one in lab.readings([row["electrode"] for row in lab.rows("electrodes")]) if one.points)
    course = lab.courses([reading.electrode], analyte, waveform)[0]
    fit = lab.cohort_fit(analyte)
    compared, groups = lab.compare(By.COATING, analyte), lab.groups(By.COATING, analyte)
    chart = lab.control(["G0-0"], Quantity.SENSITIVITY, Wanted(analyte, waveform))[0]
    backtest = lab.backtest(analyte)
    draw = electrolog.draw
    drawings: dict[str, Any] = {
        "history": lambda axes: draw.history(course, axes),
        "calibration": lambda axes: draw.calibration(reading, axes),
        "residuals": lambda axes: draw.residuals(reading, axes),
        "fan": lambda axes: draw.fan(fit, lab.fan(analyte), axes=axes),
        "days": lambda axes: draw.days(fit, axes),
        "spread": lambda axes: draw.spread(compared, groups, axes=axes),
        "survival": lambda axes: draw.survival(groups, axes),
        **{
            name: lambda axes, name=name: getattr(draw, name)(chart, axes)
            for name in ("individuals", "moving_range", "ewma", "cusum")
        },
        "reliability": lambda axes: draw.reliability(backtest, axes),
        "pit": lambda axes: draw.pit(backtest, axes),
    }
    for name, drawing in drawings.items():
        axes = Figure().add_subplot()
        assert drawing(axes) is axes, name
        assert axes.get_children(), name
        assert axes.get_title(loc="left"), name
        assert axes.get_xlabel(), name
    assert reading.calibration in draw.calibration(reading, Figure().add_subplot()).get_title(loc="left")
    with pytest.raises(electrolog.InputError, match="no measure is called 'weight'"):
        draw.spread(compared, groups, "weight")
    with pytest.raises(electrolog.InputError, match="accepted: none with triangle"):
        draw.fan(fit, lab.fan(analyte), coating="gold")


def test_without_axes_a_figure_of_its_own_is_made(cli: Any) -> None:
    from matplotlib import pyplot

    reading = electrolog.open_lab(cli.db).readings(["B07-01"])[0]
    axes = electrolog.draw.calibration(reading)
    assert axes.figure.number in pyplot.get_fignums()
    pyplot.close(axes.figure)


def test_recordings_are_read_drawn_and_logged(cli: Any, tmp_path: Path) -> None:
    time, current, _ = recordings.trace()
    np.save(tmp_path / "run.npy", np.column_stack([time, current]))
    scans, potential, clock, _ = recordings.sheet()
    head = ["time_s", *(f"{value:.6g}" for value in potential)]
    rows = [",".join(f"{cell:.6g}" for cell in (at, *row)) for at, row in zip(clock, scans, strict=True)]
    (tmp_path / "scans.csv").write_text("\n".join([",".join(head), *rows]) + "\n", encoding="utf-8")
    lab = electrolog.open_lab(cli.db, write=True)
    traced = lab.read_trace(tmp_path / "run.npy", recordings.CONCENTRATIONS)
    scanned = lab.read_scans(tmp_path / "scans.csv", recordings.CONCENTRATIONS)
    for name, recorded in (("trace", traced), *((n, scanned) for n in ("scan_trace", "voltammograms", "sheet"))):
        axes = Figure().add_subplot()
        assert getattr(electrolog.draw, name)(recorded, axes) is axes, name
    with pytest.raises(electrolog.InputError, match=r"lab\.read_scans"):
        electrolog.draw.sheet(traced)
    values = {"electrode": "B9-01", "stage": "pre", "analyte": "DA", "waveform": "triangle", "at": "2026-01-07T09:00Z"}
    entered = lab.log_recorded(traced, values)
    found = lab.readings_of([str(entered.values["calibration"])])[0]
    assert found.figures.sensitivity_na_um == pytest.approx(recordings.SENSITIVITY, rel=0.02)
    assert found.handling.signal["file"] == "run.npy"  # type: ignore[index]


def test_answers_print_themselves(judged: Any) -> None:
    lab = electrolog.open_lab(judged.db)
    reading = lab.readings([row["electrode"] for row in lab.rows("electrodes")])[0]
    lines = str(reading).splitlines()
    assert lines[0] == "Reading"
    assert f"  calibration{' ' * (lines[1].index(reading.electrode) - 13)}{reading.calibration}" in lines
    assert any(line.split()[:1] == ["figures.sensitivity_na_um"] for line in lines)
    table = reading._repr_html_()
    assert table.startswith("<table")
    assert "<th>calibration</th>" in table
    hostile = replace(reading, electrode="<b>& $x$")
    assert "<td>&lt;b&gt;&amp; $x$</td>" in hostile._repr_html_()
    run = electrolog.Run(reading.analyte, reading.waveform, "in-vivo", run_min=120)
    answers: list[Any] = [
        *(lab.check([reading.electrode], run)[0], lab.forecast([reading.electrode], run)[0]),
        *(lab.cohort_fit(reading.analyte), lab.limits()[0], lab.methods((), reading.analyte)),
        *(lab.fan(reading.analyte), lab.courses([reading.electrode])[0], lab.origin()),
    ]
    for answer in answers:
        assert answer._repr_html_().count("<tr>") == len(str(answer).splitlines()) - 1, answer


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


def test_a_label_without_a_probe_is_named_and_not_left_out(judged: Any) -> None:
    lab = electrolog.open_lab(judged.db)
    run = electrolog.Run("dopamine", "triangle", "in-vivo", run_min=60)
    for ask in (
        lab.readings,
        lab.courses,
        lambda labels: lab.check(labels, run),
        lambda labels: lab.forecast(labels, run),
    ):
        with pytest.raises(electrolog.InputError, match="no probe is called 'Z-99'"):
            ask(["Z-99"])


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
    from matplotlib import pyplot

    names: dict[str, Any] = {}
    said = io.StringIO()
    with contextlib.redirect_stdout(said):
        for cell in cells:
            if cell["cell_type"] == "code":
                exec(compile("".join(cell["source"]), cell["id"], "exec"), names)  # noqa: S102
    assert "opened to be read only" in said.getvalue()
    assert set(names["checked"][0].verdict.verdict.split()) <= {"fit", "recalibrate", "retire", "undetermined"}
    assert len(names["calibrations"]) > 0
    assert names["course"].electrode in pyplot.gcf().axes[0].get_title(loc="left")
    pyplot.close("all")
