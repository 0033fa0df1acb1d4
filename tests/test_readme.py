"""The README's bench guide is what the program really says."""

from __future__ import annotations

import math
import re
from pathlib import Path

from tests import readme

_NUMBER = re.compile(r"-?\d+(?:\.\d+)?(?:e[+-]?\d+)?")
_HASH = re.compile(r"\b[0-9a-f]{16}\b")


def test_every_block_shows_what_its_command_prints(tmp_path: Path) -> None:
    shown = readme.README.read_text(encoding="utf-8")
    found = readme.run_blocks(shown, tmp_path)
    differing = [
        f"README: {said}\n   now: {now}"
        for said, now in zip(shown.splitlines(), found.splitlines(), strict=False)
        if not _alike(said, now)
    ]
    assert not differing, "\n".join(differing[:20])
    assert len(shown.splitlines()) == len(found.splitlines())


def test_the_guide_covers_a_probes_life() -> None:
    text = readme.README.read_text(encoding="utf-8")
    commands = ("new", "coat", "condition", "standard", "calibrate", "expose", "clean", "check", "history", "retire")
    for command in commands:
        assert f"$ electrolog {command} " in text


def _alike(said: str, now: str) -> bool:
    """Words to the letter; numbers within 2 %, since a forecast's last digit is the machine's own."""
    if _blank(said) != _blank(now):
        return False
    pairs = zip(_NUMBER.findall(said), _NUMBER.findall(now), strict=True)
    return all(math.isclose(float(a), float(b), rel_tol=0.02, abs_tol=1e-12) for a, b in pairs)


def _blank(line: str) -> str:
    return re.sub(r"\s+|─+", " ", _NUMBER.sub("#", _HASH.sub("hash", line)))
