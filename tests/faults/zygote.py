"""A process that has loaded everything and opened nothing: each command line runs in a child of it, from its first
statement on, and is ended by SIGKILL after a time that the caller chose. So the kills fall into the work itself, and
not into the loading of modules before it.
"""

from __future__ import annotations

import importlib.util
import json
import os
import pkgutil
import signal
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

ROOT = Path(__file__).resolve().parents[2]
LONGEST_S = 120.0
HEAVY = ("numpy", "pandas", "scipy.linalg", "scipy.optimize", "scipy.special", "scipy.stats")


@dataclass(frozen=True)
class Ended:
    """status: the exit status, or minus the signal that ended it."""

    status: int
    out: str
    err: str
    took_s: float


class Zygote:
    def __init__(self) -> None:
        command = [sys.executable, str(Path(__file__).resolve())]
        self._process = subprocess.Popen(command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, cwd=ROOT)

    def run(
        self, arguments: list[str], kill_after_s: float = LONGEST_S, meanwhile: Callable[[], None] | None = None
    ) -> Ended:
        assert self._process.stdin is not None
        assert self._process.stdout is not None
        self._process.stdin.write(json.dumps([arguments, kill_after_s]).encode() + b"\n")
        self._process.stdin.flush()
        if meanwhile is not None:
            meanwhile()
        return Ended(*json.loads(self._process.stdout.readline()))

    def close(self) -> None:
        self._process.communicate()


def serve() -> None:
    load_everything()
    for line in sys.stdin:
        arguments, kill_after_s = json.loads(line)
        print(json.dumps(run_child(arguments, kill_after_s)), flush=True)


def load_everything() -> None:
    """All that a first command would load; a record that is thrown away makes the lazy parts load too."""
    sys.path.insert(0, str(ROOT))
    import electrolog

    for module in pkgutil.walk_packages(electrolog.__path__, "electrolog."):
        if not module.name.endswith("__main__"):
            importlib.import_module(module.name)
    for name in (*HEAVY, *(["psycopg"] if importlib.util.find_spec("psycopg") else [])):
        importlib.import_module(name)
    with tempfile.TemporaryDirectory() as folder:
        where = ["--db", str(Path(folder) / "record.db")]
        warm = (["setup"], ["new", "W"], ["verify"], ["inspect", "W", "--noise", "1nA"], ["backup", folder])
        for words in warm:
            run_child([*where, *words], LONGEST_S, fork=False)


def run_child(arguments: list[str], kill_after_s: float, fork: bool = True) -> tuple[Any, ...]:
    with tempfile.TemporaryFile("w+b") as out, tempfile.TemporaryFile("w+b") as err:
        began = time.perf_counter()
        if not fork:
            done = run_here(arguments)
            return done, "", "", time.perf_counter() - began
        child = os.fork()
        if child == 0:
            os.dup2(out.fileno(), 1)
            os.dup2(err.fileno(), 2)
            os._exit(run_here(arguments, quiet=False))
        status = waited(child, began + kill_after_s)
        took = time.perf_counter() - began
        texts = []
        for stream in (out, err):
            stream.seek(0)
            texts.append(stream.read().decode(errors="replace"))
        return os.waitstatus_to_exitcode(status), *texts, took


def run_here(arguments: list[str], quiet: bool = True) -> int:
    from electrolog.cli.main import main

    with open(os.devnull if quiet else 1, "w", encoding="utf-8", closefd=quiet) as stream:
        sys.stdout, before = stream, sys.stdout
        try:
            return main(arguments)
        finally:
            stream.flush()
            sys.stdout = before


def waited(child: int, until: float) -> int:
    while True:
        found, status = os.waitpid(child, os.WNOHANG)
        if found:
            return status
        if time.perf_counter() >= until:
            os.kill(child, signal.SIGKILL)
            return os.waitpid(child, 0)[1]
        time.sleep(0.0002)


if __name__ == "__main__":
    serve()
