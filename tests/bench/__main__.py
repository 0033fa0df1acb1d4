"""How fast, beside a floor or a peer in the same run:  python3 tests/run.py --bench [quick | NAME ...]

Without a word everything is measured; `quick` leaves out the families that take minutes, and says so.
"""

from __future__ import annotations

import compileall
import sys
from collections.abc import Sequence
from pathlib import Path

from tests.bench import arithmetic, cohort, exchange, long_jobs, table, terminal
from tests.bench.line import Family, Line

FAMILIES: tuple[Family, ...] = (
    *terminal.FAMILIES,
    *exchange.FAMILIES,
    *arithmetic.FAMILIES,
    *long_jobs.FAMILIES,
    *cohort.FAMILIES,
)
ROOT = Path(__file__).resolve().parents[2]
PACKAGE, WRITTEN = ROOT / "electrolog", ROOT / "build" / "bench.json"


def main(words: Sequence[str]) -> int:
    known = {family.name: family for family in FAMILIES}
    if unknown := set(words) - {*known, "quick"}:
        print(f"nothing is called {', '.join(sorted(unknown))}; known: quick, {', '.join(known)}")
        return 2
    named = [known[word] for word in words if word in known]
    chosen = named or [family for family in FAMILIES if not (family.heavy and "quick" in words)]
    about = table.machine()
    compileall.compile_dir(str(PACKAGE), quiet=1)  # as an installation does: a checkout may have been changed since
    print(table.heading(about), flush=True)
    lines, failed = _measured(chosen)
    print(table.markdown(lines))
    for family in FAMILIES:
        if family not in chosen:
            print(f"not asked for: {family.name}{', which takes minutes' if family.heavy else ''}")
    table.write_json(WRITTEN, about, lines)
    print(f"written to {WRITTEN}")
    return 1 if failed else 0


def _measured(chosen: Sequence[Family]) -> tuple[list[Line], bool]:
    """One family that can't be measured doesn't take the others with it."""
    lines: list[Line] = []
    failed = False
    for family in chosen:
        print(f"measuring {family.name} …", file=sys.stderr, flush=True)
        try:
            lines += family.measure()
        except Exception as why:
            print(f"{family.name} could not be measured: {type(why).__name__}: {why}", flush=True)
            failed = True
    return lines, failed


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
