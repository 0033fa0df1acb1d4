"""What each command may load: a library that a command doesn't need is time that somebody waits with a glove on."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

from tests.cli.conftest import POINTS, Terminal

HEAVY = {
    *("alembic", "calamine", "h5py", "jinja2", "matplotlib", "numpy", "openpyxl", "pandas", "plotext", "psycopg"),
    *("pyarrow", "rich", "scipy", "segno", "sqlalchemy", "statsmodels"),
}
RUN = ("--analyte", "dopamine", "--waveform", "triangle", "--setting", "in-vivo", "--run", "2h")
RECORD, ARRAYS, TABLES = {"sqlalchemy"}, {"sqlalchemy", "numpy"}, {"sqlalchemy", "numpy", "rich"}
MAY_LOAD: dict[tuple[str, ...], set[str]] = {
    ("--help",): set(),
    ("check", "--help"): set(),
    ("completion", "bash"): set(),
    ("settings",): {"rich"},
    ("new", "Z9-01"): RECORD,
    ("expose", "R1", "--for", "20min", "-s", "slice"): RECORD,
    ("clean", "R1", "-m", "isopropanol"): RECORD,
    ("note", "R1", "kinked"): RECORD,
    ("calibrate", "R1", "interim", "DA", *POINTS, "-w", "triangle", "--yes"): ARRAYS,
    ("check", "R1", *RUN): ARRAYS,
    ("calibrations", "R1"): ARRAYS,
    ("verify",): ARRAYS,
    ("history", "R1"): TABLES,
    ("forecast", "R1", *RUN): TABLES,
    ("life", "R1"): TABLES,
    ("shelf",): TABLES,
    ("list", "waveforms"): TABLES,
    ("journal",): RECORD | {"rich"},
    ("limits",): RECORD | {"rich"},
    ("export", "out"): RECORD | {"rich"},
}
PROGRAM = """
import sys
from electrolog.cli.main import main
status = main(sys.argv[1:])
print(status, *sys.modules, file=sys.stderr)
"""


@pytest.mark.parametrize("words", MAY_LOAD, ids=" ".join)
def test_a_command_loads_what_it_needs_and_no_more(words: tuple[str, ...], judged: Terminal) -> None:
    command = [sys.executable, "-c", PROGRAM, "--db", judged.db, *words]
    done = subprocess.run(command, check=True, capture_output=True, encoding="utf-8", cwd=Path(judged.db).parent)
    status, *modules = done.stderr.splitlines()[-1].split()
    assert status in ("0", "10", "20", "30"), done.stderr
    assert {name.partition(".")[0] for name in modules} & HEAVY <= MAY_LOAD[words]


def test_a_tab_loads_neither_database_library_nor_arrays(judged: Terminal) -> None:
    program = PROGRAM.replace(
        "from electrolog.cli.main import main", "from electrolog.cli.completing import completions"
    )
    program = program.replace("status = main(sys.argv[1:])", "status = len(completions(sys.argv[1:]))")
    command = [sys.executable, "-c", program, "--db", judged.db, "check", "R"]
    done = subprocess.run(command, check=True, capture_output=True, encoding="utf-8")
    count, *modules = done.stderr.splitlines()[-1].split()
    assert count == "2"
    assert {name.partition(".")[0] for name in modules} & (HEAVY | {"typer"}) == set()
