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
    """Seconds of one work in each round: by the clock, and of processor time (its own and its processes')."""

    seconds: tuple[float, ...]
    processor_s: tuple[float, ...] = ()

    @property
    def median_s(self) -> float:
        return median(self.seconds)

    @property
    def median_processor_s(self) -> float | None:
        """None where it isn't known: the system doesn't say, or the work was timed by somebody else."""
        return median(self.processor_s) if self.processor_s and min(self.processor_s) > 0 else None


def by_turns(works: Mapping[str, Work], rounds: int = ROUNDS, warm: int = 1) -> dict[str, Taken]:
    """Each work once a round. A work that returns a float has timed itself; the first `warm` rounds are not counted."""
    found: dict[str, list[tuple[float, float]]] = {name: [] for name in works}
    for turn in range(warm + rounds):
        for name, work in works.items():
            before_s, begun = _processor_s(), time.perf_counter()
            said = work()
            seconds, processor_s = time.perf_counter() - begun, _processor_s() - before_s
            if turn >= warm:
                found[name].append((said, 0.0) if isinstance(said, float) else (seconds, processor_s))
    return {name: Taken(*zip(*both, strict=True)) for name, both in found.items()}


def _processor_s() -> float:
    """Of this process and of those that have ended (Windows doesn't tell of those)."""
    now = os.times()
    of_children = now.children_user + now.children_system
    return now.user + now.system + of_children if of_children or os.name != "nt" else 0.0


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
