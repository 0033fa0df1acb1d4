"""Forecasts for a person and for a program."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from electrolog.answers.forecasting import Forecast, NowAndEnd, Quantiles
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import print_lines, print_table
from electrolog.units import shown_duration, shown_number, shown_percent


def answer(forecasts: Sequence[Forecast], json: bool, csv: bool) -> None:
    rows = [as_dict(forecast) for forecast in forecasts]
    if json:
        print_json(rows)
    elif csv:
        print_csv([plain(row) for row in rows])
    elif not forecasts:
        print_lines("no probe to forecast")
    else:
        _print(forecasts)


def as_dict(forecast: Forecast) -> dict[str, Any]:
    return {
        "electrode": forecast.electrode,
        "analyte": forecast.analyte,
        "waveform": forecast.waveform,
        "setting": forecast.setting,
        "run_min": forecast.run_min,
        "exposure_h": forecast.exposure_h,
        "sensitivity_na_um": _both(forecast.sensitivity_na_um),
        "fraction_left": _both(forecast.fraction_left),
        "basis": forecast.basis,
    }


def _both(value: NowAndEnd) -> dict[str, Any]:
    return {"now": _keyed(value.now), "end": _keyed(value.end)}


def _keyed(quantiles: Quantiles | None) -> dict[str, float] | None:
    return None if quantiles is None else {f"{q:g}": value for q, value in quantiles.items()}


def _print(forecasts: Sequence[Forecast]) -> None:
    first = forecasts[0]
    print_lines(
        f"true sensitivity to {first.analyte}, {first.waveform}, now and after {shown_duration(first.run_min)}"
        f" {first.setting}: median, and quantiles in brackets"
    )
    columns = ("probe", "exposed (h)", "own calibrations", "now (nA/µM)", "end (nA/µM)", "left at the end")
    print_table(
        columns,
        [
            (
                one.electrode,
                shown_number(one.exposure_h),
                one.basis.own_calibrations,
                _span(one.sensitivity_na_um.now, shown_number),
                _span(one.sensitivity_na_um.end, shown_number),
                _span(one.fraction_left.end, shown_percent),
            )
            for one in forecasts
        ],
        numeric=columns[1:3],
        least=("own calibrations", "exposed (h)", "left at the end"),
    )
    shapes = sorted(first.basis.shapes.items(), key=lambda item: -item[1])
    said = ", ".join(f"{name} {shown_percent(weight)}" for name, weight in shapes if weight >= 0.01)
    print_lines(
        f"rests on {first.basis.calibrations} calibrations of {first.basis.probes} probes; shapes of loss: {said}"
    )
    print_lines(*dict.fromkeys(f"! {note}" for one in forecasts for note in one.basis.notes))


def _span(quantiles: Quantiles | None, shown: Any) -> str:
    """`12.1 [10.4, 13.9]`, or ? where there is nothing to compare with."""
    if quantiles is None:
        return "?"
    values = [quantiles[q] for q in sorted(quantiles)]
    middle = values[len(values) // 2]
    return f"{shown(middle)} [{shown(values[0])}, {shown(values[-1])}]" if len(values) > 1 else shown(middle)
