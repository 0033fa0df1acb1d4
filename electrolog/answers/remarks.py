"""What has to be said beside a converted recording."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from electrolog.answers import life as lives
from electrolog.answers.curves import ReadBy
from electrolog.errors import with_article
from electrolog.measure.recording import clipped, gaps, said_of_gaps
from electrolog.record import sheets
from electrolog.record.queries import Event
from electrolog.units import shown_concentration, shown_percent

Floats = NDArray[np.float64]
CLIPPED_SHARE = 0.001
BEYOND_SHARE = 0.01
LATE_S = 60.0


def of_recording(time_s: Floats, current_na: Floats, run_s: tuple[float, float]) -> Iterator[str]:
    yield from said_of_gaps(gaps(time_s))
    unknown = int((~np.isfinite(current_na)).sum())
    if unknown:
        yield f"{unknown} of {len(current_na)} samples have no current: they are left empty"
    at_limit = clipped(current_na[np.isfinite(current_na)]).mean()
    if at_limit > CLIPPED_SHARE:
        yield f"{shown_percent(float(at_limit))} of the samples stand at the amplifier's limit: what was beyond is lost"
    if time_s[-1] > run_s[1] + LATE_S or time_s[0] < run_s[0] - LATE_S:
        yield "the recording outlasts the exposure as logged: outside it no fouling is counted"


def of_range(current_na: Floats, concentration_um: Floats, read: ReadBy) -> Iterator[str]:
    flat = (np.isfinite(current_na) & ~np.isfinite(concentration_um)).mean()
    if flat > 0:
        yield f"{shown_percent(float(flat))} of the samples lie where the calibration is flat: no number is given there"
    if read.highest_um is not None:
        with np.errstate(invalid="ignore"):
            beyond = float((concentration_um > read.highest_um).mean())
        if beyond > BEYOND_SHARE:
            highest = shown_concentration(read.highest_um)
            yield f"{shown_percent(beyond)} of the samples lie beyond {highest}, the highest concentration calibrated"


def of_calibrations(
    life: Sequence[Event], run: Event, pre: Event | None, post: Event | None, waveform: str
) -> Iterator[str]:
    if pre is None:
        yield "no calibration before the run: its start is known only backwards from the one after it"
    else:
        since = lives.voided_by([event for event in life if event.at < run.at], pre, run.at)
        if since:
            yield f"between {pre.name} and the run: {', '.join(since)}"
    if post is None:
        yield "no calibration after the run: the loss is forecast from the probe's cohort, and the band is wider for it"
    else:
        yield from _between(life, run, post)
    for other in lives.of(life, sheets.EXPOSURES):
        if other is not run and other.at < lives.end_of(run) and lives.end_of(other) > run.at:
            yield f"{other.name} is logged for a part of the same time: both count as fouling; is one of them a slip?"
    if run.row["waveform"] and run.row["waveform"] != waveform:
        yield f"the exposure was logged with {run.row['waveform']}, and is read by calibrations with {waveform}"


def _between(life: Sequence[Event], run: Event, post: Event) -> Iterator[str]:
    since = [event for event in lives.until(life, post.at) if event.at > run.at]
    for event in since:
        if event.sheet in lives.RENEWING:
            yield f"{with_article(event.sheet.one)} stands between the run and {post.name}, and hides what the run took"
    if any(event.sheet is sheets.EXPOSURES for event in since):
        yield f"other exposures stand between the run and {post.name}: the loss is shared out by the cohort's clock"
