"""The README's console blocks, run for real: `python tests/readme.py --write` puts the present output in them.

Every line that begins with `$ ` is run, in one folder, on one record, with the clock held still.
"""

from __future__ import annotations

import os
import re
import shlex
import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).resolve().parents[1]
README = ROOT / "README.md"
BLOCK = re.compile(r"(```console\n)(.*?)(```)", re.DOTALL)
CLOCK = "2026-11-02T18:00:00+00:00"


def run_blocks(text: str, folder: Path) -> str:
    """The README with what its commands print today; they run in `folder`, beside a copy of the demo lab."""
    make_lab(folder / "demo" / "lab")
    return BLOCK.sub(lambda block: block[1] + _answered(block[2], folder) + block[3], text)


def make_lab(target: Path) -> None:
    subprocess.run([sys.executable, str(ROOT / "demo" / "make_lab.py"), str(target)], check=True, capture_output=True)


def _answered(block: str, folder: Path) -> str:
    commands = [line for line in block.splitlines() if line.startswith("$ ")]
    return "".join(f"{line}\n{_output(line.removeprefix('$ '), folder)}" for line in commands)


def _output(command: str, folder: Path) -> str:
    words = shlex.split(command)
    if words[0] != "electrolog":
        raise ValueError(f"the README's console blocks run electrolog alone, not {words[0]}")
    environment = {
        **os.environ,
        "ELECTROLOG_DB": "lab.db",
        "ELECTROLOG_NOW": CLOCK,
        "TZ": "UTC",
        "COLUMNS": "100",
        "PYTHONIOENCODING": "utf-8",
        "OPENBLAS_NUM_THREADS": "1",
        "LOGNAME": "wren",
    }
    done = subprocess.run(
        [sys.executable, "-m", "electrolog", *words[1:]],
        cwd=folder,
        env=environment,
        capture_output=True,
        encoding="utf-8",
        check=False,
    )
    return done.stdout + done.stderr


if __name__ == "__main__":
    import tempfile

    with tempfile.TemporaryDirectory() as scratch:
        found = run_blocks(README.read_text(encoding="utf-8"), Path(scratch))
    if "--write" in sys.argv:
        README.write_text(found, encoding="utf-8", newline="\n")
    else:
        print(found)
