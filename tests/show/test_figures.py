"""Figures: one look, a colour map that can be trusted, functions that take and return an Axes."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from matplotlib.colors import to_rgb

from electrolog.answers.controlling import Controlled, Plotted
from electrolog.answers.signals import from_trace
from electrolog.clock import utc_now
from electrolog.errors import InputError
from electrolog.measure import control as charts
from electrolog.measure.calibrate import calibrate
from electrolog.measure.scans import read_scans
from electrolog.measure.trace import TraceSettings, read_trace
from electrolog.show import control_figure, figures, line_figure, signal_figures
from tests.measure import recordings

# sRGB to CIE XYZ (D65) and on to CIELAB: IEC 61966-2-1 and CIE 15, as usually printed.
TO_XYZ = np.array([[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]])
WHITE = np.array([0.9505, 1.0, 1.089])
# Red- and green-blind sight, full severity: Machado, Oliveira & Fernandes, IEEE TVCG 15 (2009) 1291; from memory.
BLIND = {
    "red": np.array(
        [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]]
    ),
    "green": np.array([[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.01182, 0.04294, 0.968881]]),
}


def linear(rgb: Any) -> Any:
    return np.where(rgb <= 0.04045, rgb / 12.92, ((rgb + 0.055) / 1.055) ** 2.4)


def lab(linear_rgb: Any) -> Any:
    xyz = np.clip(linear_rgb, 0, 1) @ TO_XYZ.T / WHITE
    f = np.where(xyz > (6 / 29) ** 3, np.cbrt(xyz), xyz / (3 * (6 / 29) ** 2) + 4 / 29)
    return np.stack([116 * f[:, 1] - 16, 500 * (f[:, 0] - f[:, 1]), 200 * (f[:, 1] - f[:, 2])], axis=1)


@pytest.fixture
def shades() -> Any:
    return figures.two_sided()(np.linspace(0, 1, 33))[:, :3]


def test_lightness_falls_in_even_steps_from_the_middle_to_both_ends(shades: Any) -> None:
    light = lab(linear(shades))[:, 0]
    steps = np.diff(light)
    assert (steps[:16] > 0).all()
    assert (steps[16:] < 0).all()
    assert np.abs(steps) == pytest.approx(np.abs(steps).mean(), rel=0.25)
    assert light[0] == pytest.approx(light[-1], abs=2)


def test_steps_are_even_to_the_eye(shades: Any) -> None:
    distance = np.linalg.norm(np.diff(lab(linear(shades)), axis=0), axis=1)
    assert distance == pytest.approx(distance.mean(), rel=0.3)


@pytest.mark.parametrize("sight", BLIND)
def test_both_sides_stay_apart_for_the_colour_blind(shades: Any, sight: str) -> None:
    seen = lab(linear(shades) @ BLIND[sight].T)
    apart = np.linalg.norm(seen[:8] - seen[:-9:-1], axis=1)
    assert (apart > 25).all()


def drawn(function: Any, *arguments: Any) -> Any:
    from matplotlib.figure import Figure

    axes = Figure().subplots()
    assert function(axes, *arguments) is axes
    assert axes.get_xlabel()
    assert axes.get_ylabel()
    assert axes.get_title(loc="left") or axes.get_title()
    return axes


def test_a_trace_is_drawn_with_its_plateaus_numbered() -> None:
    time, current, _ = recordings.trace()
    axes = drawn(signal_figures.draw_trace, read_trace(time, current), recordings.CONCENTRATIONS)
    assert [text.get_text() for text in axes.texts] == ["1\n0.25 µM", "2\n0.5 µM", "3\n1 µM", "4\n2 µM"]


def test_a_long_trace_is_thinned_and_keeps_its_spikes() -> None:
    time, current, _ = recordings.trace(rate_hz=500)
    current[100_000] += 500
    axes = drawn(signal_figures.draw_trace, read_trace(time, current))
    signal = axes.lines[0].get_ydata()
    assert len(signal) < 25_000
    assert signal.max() > 400


def test_scans_are_drawn() -> None:
    scans, potential, time, _ = recordings.sheet()
    reading = read_scans(scans, potential, time)
    drawn(signal_figures.draw_scan_trace, reading, recordings.CONCENTRATIONS)
    curves = drawn(signal_figures.draw_voltammograms, reading, recordings.CONCENTRATIONS)
    styles = {line.get_linestyle() for line in curves.lines[:4]}
    assert len(styles) == 4  # told apart without colour
    picture = drawn(signal_figures.draw_sheet, reading, scans)
    low, high = picture.images[0].get_clim()
    assert low == -high  # zero stands at the map's neutral middle
    assert [label.get_text() for label in picture.get_yticklabels()] == ["−0.4", "0", "1", "1.3", "1", "0", "−0.4"]


def test_a_suspect_point_is_ringed() -> None:
    x = [0.0, 1, 2, 3, 4, 5, 6]
    y = [0.1, 9.8, 20.1, 60, 39.9, 50.2, 60]
    axes = drawn(line_figure.draw_line, list(zip(x, y, strict=True)), calibrate(x, y))
    assert any("suspect" in str(line.get_label()) for line in axes.lines)


def test_control_charts_ring_what_breaks_a_rule() -> None:
    values = [12.1, 11.9, 12.0, 12.2, 11.8, 12.1, 10.0]
    single = charts.individuals(values, 6)
    sd = (float(single.upper[0]) - single.centre) / 3
    one = Controlled(
        "rig-1",
        "sensitivity",
        "nA/µM",
        tuple(Plotted(f"K{i}", "P", utc_now(), value) for i, value in enumerate(values)),
        6,
        single,
        charts.moving_range(values, 6),
        charts.ewma(values, single.centre, sd),
        charts.cusum(values, single.centre, sd),
        single.signals,
        (),
    )
    for draw in (control_figure.draw_individuals, control_figure.draw_range, control_figure.draw_ewma):
        axes = drawn(draw, one)
        rings = [line for line in axes.lines if line.get_markersize() == 11]
        assert [list(line.get_xdata()) for line in rings] == [[7]]
    drawn(control_figure.draw_cusum, one)


def test_the_same_picture_gives_the_same_file(tmp_path: Path) -> None:
    time, current, _ = recordings.trace()
    np.save(tmp_path / "run.npy", np.column_stack([time, current]))
    recorded = from_trace(tmp_path / "run.npy", recordings.CONCENTRATIONS, TraceSettings())
    made = calibrate(*zip(*recorded.points, strict=True))
    for ending in figures.FORMATS:
        paths = [tmp_path / f"{name}{ending}" for name in "ab"]
        for path in paths:
            signal_figures.draw(path, recorded, made)
        assert paths[0].read_bytes() == paths[1].read_bytes()


def test_an_ending_that_is_no_pictures_is_refused_before_anything_is_drawn(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"accepted: \.png, \.svg, \.pdf"), figures.figure(tmp_path / "a.jpg", 1, 1):
        raise AssertionError("nothing may be drawn")


def test_every_ink_stands_out_from_white() -> None:
    """WCAG 2.2, 1.4.3: a contrast of 4.5 or more, since words are written in each of them."""
    for ink in (figures.INK, figures.QUIET, figures.BLUE, figures.BROWN):
        linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in to_rgb(ink)]
        assert 1.05 / (0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2] + 0.05) >= 4.5, ink
