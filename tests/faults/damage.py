"""A file cut short or with a bit turned over, anywhere: it is named, or nothing that the record says has changed.

python tests/faults/damage.py 500
"""

from __future__ import annotations

import random
import sys
import tempfile
from collections import Counter
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from electrolog.errors import ElectrologError
from electrolog.lab import Lab, open_lab, rescue
from electrolog.record import copying


def damaged(whole: bytes, seed: int) -> tuple[str, bytes]:
    chance = random.Random(seed)  # noqa: S311 -- seeded, so that a failure can be had again
    place = chance.randrange(len(whole))
    if seed % 4 == 0:
        return f"cut at {place}", whole[:place]
    if seed % 4 == 1:
        page = place // 4096 * 4096
        return f"page at {page} zeroed", whole[:page] + bytes(4096) + whole[page + 4096 :]
    return f"bit at {place}", whole[:place] + bytes([whole[place] ^ 1 << chance.randrange(8)]) + whole[place + 1 :]


def judged(path: Path, whole: Lab) -> str:
    """`named`, `harmless` (every row is as it was), or `overlooked`."""
    try:
        lab = open_lab(str(path))
        if not lab.verify().whole:
            return "named"
        return "harmless" if rows(lab) == rows(whole) else "overlooked"
    except ElectrologError:
        return "named"


def rows(lab: Lab) -> copying.Fingerprint:
    with lab.record.reading() as connection:
        return copying.fingerprint(connection)


def saved(path: Path, target: Path) -> int:
    """Entries that could be saved, in a record that verifies; 0 where nothing could."""
    try:
        done = rescue(str(path), str(target))
    except ElectrologError:
        return 0
    assert open_lab(str(target)).verify(done.head).whole
    target.unlink()
    return done.entries


def run(lab: Lab, count: int, folder: Path) -> tuple[Counter[str], list[str], list[float]]:
    """How often each outcome; what was overlooked; and of each damaged one the share of entries that was saved."""
    whole = lab.back_up(folder / "whole")
    content, outcomes, overlooked, shares = whole.path.read_bytes(), Counter[str](), [], []
    for seed in range(count):
        path = folder / f"damaged-{seed}.db"
        what, after = damaged(content, seed)
        path.write_bytes(after)
        outcome = judged(path, open_lab(str(whole.path)))
        outcomes[outcome] += 1
        if outcome == "overlooked":
            overlooked.append(f"seed {seed}: {what}")
        if outcome == "named":
            shares.append(saved(path, folder / "saved.db") / whole.entries)
        path.unlink()
    return outcomes, overlooked, shares


if __name__ == "__main__":
    from tests.record.conftest import live

    with tempfile.TemporaryDirectory() as name:
        lab = live(open_lab(str(Path(name) / "record.db"), who="wren", create=True))
        outcomes, overlooked, shares = run(lab, int(sys.argv[1] if len(sys.argv) > 1 else 500), Path(name))
    print(dict(outcomes))
    whole, nothing = sum(share == 1 for share in shares), sum(share == 0 for share in shares)
    print(
        f"of {len(shares)} damaged: {whole} saved whole, {len(shares) - whole - nothing} in part, {nothing} not at all"
    )
    print("\n".join(overlooked))
