"""Every command can be reached, is explained, and does what the example in its help says."""

from __future__ import annotations

import ast
import importlib
import inspect
import shlex
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import pytest

from electrolog.cli.catalogue import HELP, module_of
from electrolog.cli.main import main
from tests.cli.recordings import write_nwb

# These need a recording or a cohort, which their own tests make.
WITH_THEIR_OWN_TESTS = {
    *("trace", "scans", "backtest", "fit", "forecast", "check", "control", "convert", "assign"),
    "roles",  # on a server
    "settings",  # with a file of its own
}
ON_AN_EMPTY_RECORD = {"adopt", "new", "setup", "import"}
STATUSES = {"check": {0, 10, 20, 30}}


def examples(name: str) -> list[str]:
    lines = inspect.cleandoc(importlib.import_module(module_of(name)).command.__doc__ or "").splitlines()
    return [line.strip() for line in lines if line.startswith("electrolog ")]


@pytest.mark.parametrize("name", HELP)
def test_a_command_is_explained_with_an_example(name: str, empty: Any) -> None:
    answer = empty.ok(name, "--help")
    assert answer.out.startswith(f"Usage: electrolog {name}")
    found = examples(name)
    assert found
    assert all(shlex.split(example)[1:] for example in found)
    assert all(example in answer.out for example in found)
    assert any(name in shlex.split(example) for example in found)
    assert HELP[name].endswith(".")


@pytest.mark.parametrize("name", [name for name in HELP if name not in WITH_THEIR_OWN_TESTS])
def test_a_commands_example_works_as_it_stands(name: str, request: pytest.FixtureRequest, tmp_path: Path) -> None:
    cli = request.getfixturevalue("empty" if name in ON_AN_EMPTY_RECORD else "cli")
    prepare(name, cli, tmp_path)
    for example in examples(name):
        answer = cli(*shlex.split(example)[1:])
        assert (answer.status, answer.err) == (0, ""), example
        assert answer.out
    assert cli.ok("verify").out.startswith("the record is what the journal says")


def prepare(name: str, cli: Any, folder: Path) -> None:
    if name == "standard":  # the filled record has the example's own already
        cli.ok("amend", "standard", "S-48-DA", "standard=S-47-DA", "--why", "room for the example")
    elif name == "again":
        cli.ok("calibrate", "B9-01", "pre", "DA", "0:0.1", "0.5uM:6.1", "1uM:12.2", "2uM:24", "-w", "triangle")
    elif name == "adopt":
        (folder / "factors.csv").write_text("probe,date,stage,nA/uM\nK1,2024-03-04,pre,12\n", encoding="utf-8")
    elif name == "runs":
        write_nwb(folder / "recordings" / "B9-01.nwb")
    elif name == "enclose":
        write_nwb(folder / "B07-01_R1.nwb", began=datetime(2026, 1, 8, 9, tzinfo=UTC))
    elif name == "restore":
        cli.ok("backup", "backups")
        (written,) = (folder / "backups").iterdir()
        written.rename(folder / shlex.split(examples(name)[0])[-1])
    elif name == "move":
        cli.ok("backup", "backups")
        (written,) = (folder / "backups").iterdir()
        written.rename(folder / "lab.db")
    elif name == "import":
        (folder / "demo" / "lab").mkdir(parents=True)
        (folder / "demo" / "lab" / "batches.csv").write_text("batch\nB1\n", encoding="utf-8")


def test_the_overview_names_every_command_and_its_line(empty: Any) -> None:
    out = " ".join(empty.ok("--help").out.split())
    assert all(name in out and " ".join(text.split()) in out for name, text in HELP.items())


def test_without_a_command_the_overview_is_shown(capsys: pytest.CaptureFixture[str]) -> None:
    main([])
    assert "shelf" in capsys.readouterr().out


def test_every_file_of_the_room_is_a_command_or_serves_them() -> None:
    import electrolog.cli

    folder = Path(electrolog.cli.__file__).parent
    modules = {
        path.stem
        for path in folder.glob("*.py")
        for node in ast.parse(path.read_text(encoding="utf-8")).body
        if isinstance(node, ast.FunctionDef) and node.name == "command"
    }
    assert modules == {module_of(name).rsplit(".", 1)[1] for name in HELP}


def test_the_same_option_means_the_same_everywhere() -> None:
    """`--at` and its like are declared once; a second declaration would drift."""
    import electrolog.cli

    shared = ("--yes", "--json", "--csv", "--by")
    source = {path.name: path.read_text(encoding="utf-8") for path in Path(electrolog.cli.__file__).parent.glob("*.py")}
    for option in shared:
        assert [name for name, text in source.items() if f'"{option}"' in text and name != "main.py"] == ["options.py"]
