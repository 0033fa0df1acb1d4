"""What every command shares: which record, which zone, and how a doubt is put to whoever types."""

from __future__ import annotations

import gc
import sys
from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, TypeVar

import typer

from electrolog.errors import DoubtfulEntry
from electrolog.show.text import safe

if TYPE_CHECKING:
    from electrolog.lab import Lab

Answer = TypeVar("Answer")


@dataclass(frozen=True)
class Session:
    db: str | None
    zone: str | None

    def lab(self, create: bool = False) -> Lab:
        from electrolog.clock import zone_named
        from electrolog.lab import open_lab

        opened = open_lab(self.db, zone=zone_named(self.zone), create=create)
        gc.freeze()  # what was loaded stays until the end, and is passed over from here on
        gc.enable()
        return opened


def lab_of(ctx: typer.Context, create: bool = False) -> Lab:
    session: Session = ctx.obj
    return session.lab(create)


def once_confirmed(entry: Callable[[bool], Answer], yes: bool) -> Answer:
    """Writes an entry; where it looks like a slip, asks first. Without a terminal nobody is there to ask: refused."""
    try:
        return entry(yes)
    except DoubtfulEntry as doubt:
        if not (sys.stdin.isatty() and sys.stderr.isatty()):
            raise
        for text in doubt.doubts:
            typer.echo(f"  ? {safe(text)}", err=True)
        typer.confirm("Write it as it stands?", abort=True, err=True)
        return entry(True)
