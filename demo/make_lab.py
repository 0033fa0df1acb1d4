"""Write the invented lab's record as an exchange folder, two recordings beside it:  python demo/make_lab.py [FOLDER]

The truth behind every number stands in truth.toml. The same seed gives the same bytes on every machine.
"""

from __future__ import annotations

import sys
from pathlib import Path

from invented_lab.folder import write_folder
from invented_lab.lab import invented_lab
from invented_lab.recording import write_recordings
from invented_lab.truth import TRUTH

FOLDER = Path(__file__).with_name("lab")


def make_lab(folder: Path = FOLDER, seed: int = TRUTH["seed"]) -> None:
    write_folder(folder, invented_lab(seed).tables)


if __name__ == "__main__":
    target = Path(sys.argv[1]) if len(sys.argv) > 1 else FOLDER
    make_lab(target)
    write_recordings(target.with_name("recordings"))
    print(f"wrote the invented lab to {target}")
