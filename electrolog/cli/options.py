"""Options and arguments that several commands share, so that they are called the same everywhere."""

from __future__ import annotations

from typing import Annotated

import typer

Labels = Annotated[
    list[str], typer.Argument(metavar="PROBE...", help="Labels, lists or ranges: B1-01  B1-01,B1-04  B1-01..B1-08")
]
At = Annotated[str, typer.Option("--at", metavar="TIME", help="now, 'yesterday 14:30', '2h ago', ISO 8601")]
Note = Annotated[str | None, typer.Option("--note", help="Anything else worth keeping.")]
By = Annotated[str | None, typer.Option("--by", help="Who did it.")]
Yes = Annotated[bool, typer.Option("--yes", "-y", help="Write it even if it looks like a slip.")]
Json = Annotated[bool, typer.Option("--json", help="One JSON document on standard output.")]
Csv = Annotated[bool, typer.Option("--csv", help="CSV on standard output.")]
Why = Annotated[str, typer.Option("--why", help="The reason, kept in the journal.")]
Waveform = Annotated[str | None, typer.Option("--waveform", "-w", help="Waveform applied.")]
Medium = Annotated[str | None, typer.Option("--medium", help="What it was in.")]
Analyte = Annotated[str | None, typer.Option("--analyte", "-a", help="Analyte, by name or abbreviation.")]
ChartOption = Annotated[bool, typer.Option("--chart", help="Draw even where nobody sits at a terminal.")]
Plain = Annotated[bool, typer.Option("--plain", help="Sentences in place of a drawing, for a screen reader.")]
