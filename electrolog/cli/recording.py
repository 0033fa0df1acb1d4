"""What the commands that read a recording have in common: their options, and the way from file to calibration."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from electrolog.cli.session import once_confirmed
from electrolog.errors import InputError, shortened
from electrolog.units import CONCENTRATION_UM, parse_quantity

if TYPE_CHECKING:
    from electrolog.answers.signals import Recorded
    from electrolog.lab import Lab
    from electrolog.measure.recording import Span

Probe = Annotated[str, typer.Argument(metavar="PROBE", help="Its label.")]
Stage = Annotated[str, typer.Argument(metavar="STAGE", help="pre, interim or post")]
AnalyteName = Annotated[str, typer.Argument(metavar="ANALYTE", help="Name or abbreviation.")]
Concentrations = Annotated[
    list[str] | None,
    typer.Argument(metavar="[CONCENTRATION...]", help="Of each injection in order: 0.25uM 0.5uM 1uM (µM if bare)"),
]
Standard = Annotated[str | None, typer.Option("--standard", help="Label of the standard.")]
Temperature = Annotated[str | None, typer.Option("--temperature", help="Of the buffer: 37C")]
Rig = Annotated[str | None, typer.Option("--rig", help="Which rig.")]
Name = Annotated[str | None, typer.Option("--label", help="Label of the calibration (default: the next C…).")]
Weights = Annotated[str, typer.Option("--weights", help="equal, 1/x, 1/x2, replicates, or noise and share: 0.2nA+3%")]
ThroughZero = Annotated[bool, typer.Option("--through-zero", help="Hold the line at zero.")]
FigureFile = Annotated[
    Path | None, typer.Option("--figure", metavar="FILE", help="Draw what was found: .png, .svg or .pdf")
]
Look = Annotated[bool, typer.Option("--look", help="Only say (and draw) what is found; log nothing.")]
Injections = Annotated[
    Path | None,
    typer.Option("--injections", metavar="FILE", help="A CSV table instead: start_s, end_s[, concentration_um]"),
]
PlateauPart = Annotated[
    str, typer.Option("--plateau", metavar="FROM-TO", help="Which part of an injection is its plateau.")
]
Edge = Annotated[
    float, typer.Option("--edge", metavar="SECONDS", help="Levels this far before and after are compared.")
]
Negative = Annotated[bool, typer.Option("--negative", help="Oxidation was recorded as negative: turn the recording.")]
LeaveOut = Annotated[
    list[int] | None,
    typer.Option("--leave-out", metavar="NUMBER", help="An injection to leave out; it is kept on record."),
]


@dataclass(frozen=True)
class Wanted:
    """What to do with a recording once it is read."""

    values: dict[str, str | None]
    weights: str
    through_zero: bool
    figure: Path | None
    look: bool
    yes: bool
    json: bool


def concentrations_of(texts: Sequence[str] | None, table: Path | None) -> tuple[list[float], tuple[Span, ...] | None]:
    """Each injection's (µM), and the injections where a table gives them."""
    typed = [parse_quantity(text, CONCENTRATION_UM, "concentration") for text in texts or []]
    below = [text for text, value in zip(texts or [], typed, strict=True) if value < 0]
    if below:
        raise InputError(f"concentration: '{shortened(below[0])}' lies below zero; accepted: zero or more")
    spans: tuple[Span, ...] | None = None
    if table is not None:
        from electrolog.answers.signals import injections_given

        spans, known = injections_given(table)
        typed = typed or list(known or ())
    if not typed:
        raise InputError(
            "concentrations: missing; accepted: that of each injection in order, such as 0.25uM 0.5uM 1uM 2uM",
            "or a table of injections with a column concentration_um",
        )
    return typed, spans


def part(text: str, what: str) -> tuple[float, float]:
    """`0.5-0.95` as two numbers."""
    first, _, last = text.partition("-")
    try:
        return float(first), float(last)
    except ValueError:
        raise InputError(f"{what}: '{shortened(text)}' is no stretch; accepted: such as 0.5-0.95") from None


def log_or_show(lab: Lab, recorded: Recorded, wanted: Wanted) -> None:
    """Draws, then logs the calibration and answers with it; with `look`, only says what was found."""
    from electrolog.answers.handling import Handling
    from electrolog.show import calibrations, signals

    handling = Handling(wanted.weights, wanted.through_zero, recorded.account)
    figures = lab.figures_of_points(recorded.points, handling, recorded.columns.get("noise_na"))
    if wanted.figure is not None:
        from electrolog.show.signal_figures import draw

        draw(wanted.figure, recorded, figures)
    if wanted.look:
        signals.answer(recorded, figures, wanted.json)
        return
    entered = once_confirmed(
        lambda confirmed: lab.log_recorded(recorded, wanted.values, handling, confirmed=confirmed), wanted.yes
    )
    calibrations.answer(lab.readings_of([str(entered.values["calibration"])]), wanted.json)
