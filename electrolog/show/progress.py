"""What takes longer than a second says so on standard error, to whoever sits at a terminal; a pipe hears nothing."""

from __future__ import annotations

import sys
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import Any

Tell = Callable[[str, int], None]
PATIENCE_S = 1.0


@contextmanager
def working(what: str) -> Iterator[Tell]:
    """Yields a function that is told what is under way and how much of it is done.

    Nothing is loaded before the second is over: quick commands stay quick.
    """
    if not sys.stderr.isatty():
        yield lambda what, done: None
        return
    shown = _Shown(what)
    timer = threading.Timer(PATIENCE_S, shown.start)
    timer.daemon = True
    timer.start()
    try:
        yield shown.tell
    finally:
        timer.cancel()
        shown.stop()


class _Shown:
    """Started by the timer's thread and stopped by the command's: a lock keeps a late start from outliving the end."""

    def __init__(self, what: str) -> None:
        self._what = what
        self._lock = threading.Lock()
        self._over = False
        self._bar: Any = None
        self._task: Any = None

    def start(self) -> None:
        from rich.console import Console
        from rich.progress import BarColumn, Progress, TextColumn, TimeElapsedColumn

        with self._lock:
            if self._over:
                return
            columns = (TextColumn("{task.description}", markup=False), BarColumn(bar_width=20), TimeElapsedColumn())
            console = Console(stderr=True, markup=False, highlight=False)
            # What the command prints meanwhile goes to its own streams, untouched.
            self._bar = Progress(
                *columns, console=console, transient=True, redirect_stdout=False, redirect_stderr=False
            )
            self._task = self._bar.add_task(self._what, total=None)
            self._bar.start()

    def tell(self, what: str, done: int) -> None:
        self._what = f"{what}: {done}" if done else what
        with self._lock:
            if self._bar is not None and not self._over:
                self._bar.update(self._task, description=self._what)

    def stop(self) -> None:
        with self._lock:
            self._over = True
            if self._bar is not None:
                self._bar.stop()
