"""A methods paragraph and its supplementary table: every number from the record, nothing that it doesn't say."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

from electrolog.show.machine import print_csv, print_json
from electrolog.show.tables import print_lines, with_error
from electrolog.units import counted, shown_concentration, shown_number

if TYPE_CHECKING:
    from electrolog.answers.methods import Described, Spread


def answer(found: Described, json: bool, csv: bool) -> None:
    if json:
        print_json(found)
    elif csv:
        print_csv(found.table)
    else:
        print_lines(paragraph(found), "", f"supplementary table: {counted(len(found.table), 'row')} with --csv")


def paragraph(found: Described) -> str:
    return " ".join(_sentences(found))


def _sentences(found: Described) -> Iterator[str]:
    yield from _making(found)
    yield from _sweeps(found)
    yield from _calibrating(found)
    yield from _running(found)
    yield from _leaving_out(found)
    yield f"Figures were computed with electrolog ({', '.join(found.computed_by)})."


def _making(found: Described) -> Iterator[str]:
    batches = f" from {counted(found.batches, 'batch', 'batches')}" if found.batches else ""
    yield f"{counted(len(found.probes), 'carbon-fibre microelectrode')}{batches} were calibrated for {found.analyte}."
    if found.length_um is None:
        yield "Exposed length: not recorded."
    else:
        yield f"Exposed length was {_spread(found.length_um, 'µm')}{_of(found.length_um, len(found.probes))}."
    if found.diameter_um:
        yield f"Diameter was {_spread(found.diameter_um, 'µm')}{_of(found.diameter_um, len(found.probes))}."
    for what, words in (("Fibre", found.fibres), ("Insulation", found.insulations), ("Coating", found.coatings)):
        yield f"{what}: {_words(words)}."


def _sweeps(found: Described) -> Iterator[str]:
    for wave in found.waveforms:
        yield (
            f"Waveform {wave['waveform']}: vertices {wave['vertices_v']} V"
            f" at {shown_number(wave['scan_rate_v_s'])} V/s, {shown_number(wave['frequency_hz'])} Hz."
        )


def _calibrating(found: Described) -> Iterator[str]:
    stages = ", ".join(f"{count} {stage}" for stage, count in found.stages.items())
    said = f"There were {counted(sum(found.stages.values()), 'calibration')} ({stages}); medium: {_words(found.media)}"
    said += f"; temperature {_spread(found.temperature_c, '°C') if found.temperature_c else 'not recorded'}"
    said += f"; {_spread(found.points, 'points each')}" if found.points else ""
    said += f"; {found.without_points} with the factor alone" if found.without_points else ""
    yield f"{said}."
    yield "Each probe's own calibrations were used, not a factor pooled over probes."
    for stage, values in found.sensitivity_na_um.items():
        yield f"Sensitivity ({stage}) was {_spread(values, 'nA/µM')} over {counted(values.n, 'calibration')}."
    if found.lod_um:
        low, high = shown_concentration(found.lod_um.least), shown_concentration(found.lod_um.most)
        yield f"Limits of detection ranged from {low} to {high} over {counted(found.lod_um.n, 'calibration')}."


def _running(found: Described) -> Iterator[str]:
    if not found.runs:
        return
    yield f"{counted(found.runs.n, 'run')} ({_words(found.settings)}) lasted {_spread(found.runs, 'min')}."
    if found.hours_to_run:
        runs = counted(found.hours_to_run.n, "run")
        yield f"Pre-calibration preceded the run by {_spread(found.hours_to_run, 'h')} ({runs})."
    if found.hours_from_run:
        posts = counted(found.hours_from_run.n, "run")
        yield f"Post-calibration followed the run after {_spread(found.hours_from_run, 'h')} ({posts})."
    if found.untimed_runs:
        yield f"Of {counted(found.untimed_runs, 'run')} only the day is known, and no time to a calibration."
    if found.share_left:
        share = _spread(found.share_left, "of the reference sensitivity")
        yield f"At post-calibration {share} was left (n = {found.share_left.n})."


def _leaving_out(found: Described) -> Iterator[str]:
    if found.uncalibrated:
        yield f"{counted(found.uncalibrated, 'probe')} without a calibration for it left out."
    if found.retired:
        yield f"Retired probes are included: {_words(found.retired)}."
    if found.struck:
        said = "; ".join(f"{label}: {reason or 'no reason given'}" for label, reason in found.struck.items())
        yield f"Left out: {counted(len(found.struck), 'calibration')} ({said})."
    else:
        yield "No calibration was left out."


def _spread(values: Spread, unit: str) -> str:
    if values.least == values.most:
        return f"{shown_number(values.mean)} {unit}"
    span = f"{shown_number(values.least)} to {shown_number(values.most)}"
    return f"{with_error(values.mean, values.sd)} {unit} (mean ± SD, {span})"


def _of(values: Spread, whole: int) -> str:
    return "" if values.n == whole else f", known of {values.n} of {whole}"


def _words(words: dict[str, int]) -> str:
    if len(words) == 1:
        return next(iter(words)) or "not recorded"
    return ", ".join(f"{word or 'not recorded'} ({count})" for word, count in words.items())
