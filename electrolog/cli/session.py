"""What every command shares: which record, which zone, and how a doubt is put to whoever types."""

from __future__ import annotations

import gc
import os
import sys
from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, TypeVar

import typer

from electrolog.errors import DoubtfulEntry, PasswordNeeded
from electrolog.show.text import safe

if TYPE_CHECKING:
    from electrolog.lab import Lab

Answer = TypeVar("Answer")


@dataclass(frozen=True)
class Session:
    db: str | None
    zone: str | None

    def lab(self, create: bool = False) -> Lab:
        try:
            opened = self._opened(create)
        except PasswordNeeded as refused:
            if not (sys.stdin.isatty() and sys.stderr.isatty()):
                raise
            typer.echo(safe(refused.message), err=True)
            # The driver looks for it there; it is gone with this process.
            os.environ["PGPASSWORD"] = typer.prompt("Password", hide_input=True, err=True)
            opened = self._opened(create)
        gc.freeze()  # what was loaded stays until the end, and is passed over from here on
        gc.enable()
        return opened

    def _opened(self, create: bool) -> Lab:
        from electrolog.clock import zone_named
        from electrolog.lab import open_lab

        return open_lab(self.db, zone=zone_named(self.zone), create=create)


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
