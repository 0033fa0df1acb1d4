"""What is told of a recording, in whatever file it lies: its probe, its run, its papers, its currents converted."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from electrolog.answers import converting
from electrolog.answers.converting import Converted
from electrolog.answers.history import usual_waveform
from electrolog.answers.recordings.candidates import Folder, Given
from electrolog.answers.recordings.listed import LIST, Listed, read_list
from electrolog.answers.recordings.naming import Labels
from electrolog.answers.recordings.papers import Occasion, Papers, papers
from electrolog.answers.recordings.run_of import Recorded, run_of
from electrolog.answers.recordings.tables import Meaning, Table, number, table
from electrolog.answers.recordings.told import Told
from electrolog.answers.recordings.wanted import Enclosed, Wanted
from electrolog.answers.signal_files import fingerprint
from electrolog.errors import InputError
from electrolog.record.names import Names
from electrolog.record.store import Record

Floats = NDArray[np.float64]
SENSITIVITY = {
    "time_s": number("time on the recording's clock, in s"),
    "low_na_um": number("5 % quantile of the true sensitivity then, in nA/µM"),
    "median_na_um": number("its median, in nA/µM"),
    "high_na_um": number("its 95 % quantile, in nA/µM"),
}
CONVERSION = {
    "what": Meaning("what the conversion rests on"),
    "value": Meaning("its value, in the unit that stands in its name"),
}


def listed_of(wanted: Wanted) -> Listed | None:
    """The recording's row in the list of its folder. Raises InputError where the list names several probes."""
    rows = [row for row in read_list(wanted.file.resolve().parent) if row.file == wanted.file.name]
    if wanted.probe is not None:
        named = wanted.probe.strip().casefold()
        rows = [row for row in rows if (row.text("probe") or named).casefold() == named]
    probes = list(dict.fromkeys(filter(None, (row.text("probe") for row in rows))))
    if len(probes) > 1:
        raise InputError(f"{wanted.file.name}: {LIST} names {', '.join(probes)}: which probe is it? --probe names one")
    return rows[0] if rows else None


def label_of(record: Record, wanted: Wanted, row: Listed | None, told: Told) -> str:
    with record.reading() as connection:
        labels = Labels(spelling for spelling, _ in Names(connection).everything("electrodes").values())
    if wanted.probe is not None:
        return labels.required(wanted.probe)
    try:
        found = Folder(wanted.file.resolve().parent, None, Given(), labels).probes(wanted.file.name, row, told)
    except InputError as why:
        raise InputError(f"{wanted.file.name}: {why.message}", "name it with --probe") from None
    if len(found) > 1:
        said = ", ".join(one.label for one in found)
        raise InputError(f"{wanted.file.name}: holds papers of {said}: which probe is it? --probe names one")
    return found[0].label


def occasion_of(
    record: Record, wanted: Wanted, label: str, recorded: Recorded, sha256: str | None
) -> tuple[Occasion, int | None]:
    """With the run's number, where it is on record."""
    run = run_of(record, label, wanted.exposure, recorded, wanted.stem)
    start = run.at if run is not None else recorded.start
    if start is None:
        raise InputError(
            f"{wanted.file.name}: when did it begin? accepted: --start, a row in recordings.csv, or the run"
        )
    minutes = run.row["duration_min"] if run is not None else (recorded.length_s or 0.0) / 60
    setting = wanted.setting or (run.row["setting"] if run is not None else None)
    occasion = Occasion(
        label=label,
        analyte=wanted.analyte,
        waveform=wanted.waveform or usual_waveform(record, label, wanted.analyte),
        start=start,
        setting=setting,
        run_min=minutes,
        needs_um=wanted.needs_um,
        file=wanted.file.name,
        sha256=sha256 or fingerprint(wanted.file),
    )
    return occasion, None if run is None else run.row["id"]


def gathered(
    record: Record,
    wanted: Wanted,
    occasion: Occasion,
    exposure: int | None,
    recorded: Recorded,
    trace: tuple[Floats, Floats] | None,
) -> tuple[Papers, Converted | None]:
    found = papers(record, occasion)
    if trace is None:
        return found, None
    if exposure is None:
        raise InputError(
            f"{wanted.file.name}: its run isn't on record, so that nobody knows how {occasion.label} fouled meanwhile",
            "log it with `electrolog runs FOLDER --commit`, or name it with --exposure",
        )
    asked = converting.Wanted(
        wanted.file, occasion.label, occasion.analyte, occasion.waveform, exposure, recorded.zero, trace=trace
    )
    made = converting.converted(record, asked)
    return replace(found, tables=(*found.tables, *_rests_on(made))), made


def _rests_on(made: Converted) -> list[Table]:
    account = {name: value for name, value in made.account.items() if name != "sensitivity"}
    rows = [{"what": name, "value": value} for name, value in _spread(account)]
    return [
        table(
            "sensitivity", "the sensitivity that the conversion reckons with", SENSITIVITY, made.account["sensitivity"]
        ),
        table("conversion", "what the concentrations rest on", CONVERSION, rows),
    ]


def _spread(value: Any, name: str = "") -> Iterator[tuple[str, Any]]:
    """`before.calibration`, `warnings.1`: a value for each name."""
    parts: Iterable[tuple[Any, Any]] = ()
    if isinstance(value, Mapping):
        parts = value.items()
    elif isinstance(value, list | tuple):
        parts = enumerate(value, start=1)
    else:
        yield name, value
    for key, part in parts:
        yield from _spread(part, f"{name}.{key}" if name else str(key))


def answer_of(
    found: Papers,
    target: Path,
    series: tuple[str, ...],
    exposure: int | None,
    said: tuple[str, ...],
    made: Converted | None,
) -> Enclosed:
    return Enclosed(
        electrode=found.label,
        target=str(target),
        tables={one.name: len(one) for one in found.tables},
        series=series,
        factor=found.factor,
        verdict=None if found.verdict is None else found.verdict.verdict,
        exposure=exposure,
        warnings=(*said, *found.said, *(() if made is None else made.warnings)),
    )
