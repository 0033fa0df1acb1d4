"""Timing by turns: what is compared runs one after the other in each round, so that a busy moment hits both alike."""

from __future__ import annotations

import os
import subprocess
import sys
import time
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from statistics import median

ROUNDS = 5
Work = Callable[[], object]
ONE_THREAD = dict.fromkeys(("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"), "1")


@dataclass(frozen=True)
class Taken:
    """Seconds of one work in each round."""

    seconds: tuple[float, ...]

    @property
    def median_s(self) -> float:
        return median(self.seconds)

    @property
    def least_s(self) -> float:
        return min(self.seconds)


def by_turns(works: Mapping[str, Work], rounds: int = ROUNDS, warm: int = 1) -> dict[str, Taken]:
    """Each work once a round. A work that returns a float has timed itself; the first `warm` rounds are not counted."""
    found: dict[str, list[float]] = {name: [] for name in works}
    for turn in range(warm + rounds):
        for name, work in works.items():
            begun = time.perf_counter()
            said = work()
            seconds = said if isinstance(said, float) else time.perf_counter() - begun
            if turn >= warm:
                found[name].append(seconds)
    return {name: Taken(tuple(seconds)) for name, seconds in found.items()}


def python(*arguments: str | Path, more: Mapping[str, str] | None = None, allowed: Sequence[int] = (0,)) -> Work:
    """A command of the environment's Python, from beginning to end, its output thrown away."""
    command = [sys.executable, *map(str, arguments)]
    variables = {**os.environ, **ONE_THREAD, **(more or {})}

    def run() -> None:
        done = subprocess.run(command, check=False, capture_output=True, env=variables)
        if done.returncode not in allowed:
            said = done.stderr.decode(errors="replace").strip()[-500:]
            raise RuntimeError(f"{' '.join(command[:8])} ended with {done.returncode}: {said}")

    return run


def typed(*words: str | Path, more: Mapping[str, str] | None = None) -> Work:
    """An electrolog command as a person types it; a verdict's exit status is an answer."""
    return python(INSTALLED, *words, more=more, allowed=(0, 10, 20, 30))


def _installed() -> str:
    """The script that an installation puts beside its Python; without it, the package itself."""
    beside = Path(sys.executable).with_name("electrolog")
    return str(beside) if beside.is_file() else str(Path(__file__).resolve().parents[2] / "electrolog" / "__main__.py")


INSTALLED = _installed()
