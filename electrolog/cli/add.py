from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.logging import say
from electrolog.cli.options import Json
from electrolog.cli.session import lab_of
from electrolog.errors import InputError, shortened, unknown

_SHEETS = {"analyte": "analytes", "waveform": "waveforms"}


def command(
    ctx: typer.Context,
    kind: Annotated[str, typer.Argument(metavar="KIND", help="analyte, waveform, or a word list such as setting")],
    name: Annotated[str, typer.Argument(metavar="NAME", help="The name, as people type it.")],
    values: Annotated[list[str] | None, typer.Argument(metavar="[COLUMN=VALUE...]", help="What else is known.")] = None,
    json: Json = False,
) -> None:
    """Add a word to a list, an analyte, or a waveform.

    electrolog add setting "brain phantom" meaning="agar, 0.6 %"

    electrolog add waveform sawhorse vertices_v="-0.4 1.3 1.3 -0.4" scan_rate_v_s=400 frequency_hz=10
    """
    from electrolog.record.sheets import WORD_KINDS

    known = dict(split(text) for text in values or [])
    if kind in _SHEETS:
        entered = lab_of(ctx).log_plain(_SHEETS[kind], {kind: name, **known})
    elif kind in WORD_KINDS:
        entered = lab_of(ctx).log_plain("terms", {"kind": kind, "term": name, **known})
    else:
        raise unknown("kind", kind, [*_SHEETS, *WORD_KINDS])
    say([entered], json)


def split(text: str) -> tuple[str, str]:
    """`column=value`. Raises InputError."""
    column, equals, value = text.partition("=")
    if not equals or not column.strip():
        raise InputError(f"'{shortened(text)}' is no pair; accepted: column=value, such as note=\"tip bent\"")
    return column.strip(), value
