"""Each room imports only the rooms below it, and nothing heavy before it is used."""

from __future__ import annotations

import ast
import importlib.util
import shutil
import subprocess
import sys
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[1]
PACKAGE = ROOT / "electrolog"

GROUND = ("units", "errors", "clock", "texts")
ROOMS = (*GROUND, "record", "measure", "fouling", "judge", "answers", "lab", "show", "cli")  # from the ground up
DOOR = {"": "show", "__main__": "cli"}  # the package itself offers figures too; `python -m electrolog`

BELOW = {room: {*ROOMS[: ROOMS.index(room)]} | ({*GROUND} if room in GROUND else set()) for room in ROOMS}
BELOW["measure"] = {*GROUND}  # arrays in, dataclasses out: nothing of the database
BELOW["fouling"] = {*GROUND, "measure"}

ONLY_IN = {
    "sqlalchemy": {"record"},
    "alembic": {"record"},
    "psycopg": {"record"},
    "typer": {"cli"},
    "click": {"cli"},
    "rich": {"show", "cli"},
}
LIBRARIES = {room: set() for room in GROUND} | {room: {"numpy", "scipy"} for room in ("measure", "fouling", "judge")}
EARLY = {  # what may be imported at the top of a module, where it is always loaded
    "numpy": {"measure", "fouling", "judge", "answers"},
    "sqlalchemy": {"record"},
    "typer": {"cli"},
    "click": {"cli"},
    "rich": {"show", "cli"},
}
NEVER_EARLY = ("alembic", "matplotlib", "pandas", "scipy.optimize", "scipy.stats", "sqlalchemy.orm")

MODULES = sorted(PACKAGE.rglob("*.py"))
PROMISED = {
    *("README.md", "DEVELOPERS.md", "LICENSE", "pyproject.toml", ".gitignore"),
    *(".ci", "electrolog", "migrations", "tests", "demo"),
}


def room_of(path: Path) -> str:
    first = path.relative_to(PACKAGE).parts[0].removesuffix(".py").replace("__init__", "")
    return DOOR.get(first, first)


def imported(node: ast.AST) -> list[str]:
    """Whole names: `from electrolog.record import journal` names electrolog.record.journal."""
    if isinstance(node, ast.Import):
        return [name.name for name in node.names]
    if isinstance(node, ast.ImportFrom):
        assert node.level == 0, f"line {node.lineno}: imports are written out from the top"
        return [f"{node.module}.{name.name}" for name in node.names]
    return []


def imports(path: Path) -> list[str]:
    return [name for node in ast.walk(tree(path)) for name in imported(node)]


def early_imports(path: Path) -> list[str]:
    return [name for node in run_on_import(tree(path)) for name in imported(node)]


def tree(path: Path) -> ast.Module:
    return ast.parse(path.read_text(encoding="utf-8"), str(path))


def run_on_import(node: ast.AST) -> Iterator[ast.AST]:
    for child in ast.iter_child_nodes(node):
        if isinstance(child, ast.FunctionDef | ast.AsyncFunctionDef | ast.Lambda):
            continue
        if isinstance(child, ast.If) and ast.unparse(child.test).endswith("TYPE_CHECKING"):
            continue
        yield child
        yield from run_on_import(child)


def short(path: Path) -> str:
    return path.relative_to(ROOT).as_posix()


def outside(names: list[str]) -> set[str]:
    tops = {name.partition(".")[0] for name in names}
    return tops - sys.stdlib_module_names - {"electrolog"}


Found = dict[str, set[str]]


def found(names_in: Callable[[Path, str], set[str]]) -> Found:
    """What each module does that its room may not."""
    every = {short(path): names_in(path, room_of(path)) for path in MODULES}
    return {module: names for module, names in every.items() if names}


def test_every_module_stands_in_a_known_room() -> None:
    rooms = {room_of(path) for path in MODULES}
    assert rooms <= {*ROOMS}
    assert rooms >= {*GROUND, "record", "measure", "fouling"}


def test_rooms_import_only_the_rooms_below() -> None:
    def above(path: Path, room: str) -> set[str]:
        used = {name.split(".")[1] for name in imports(path) if name.startswith("electrolog.")}
        return used - BELOW[room] - {room}

    assert found(above) == {}


def test_libraries_stay_in_their_rooms() -> None:
    def strangers(path: Path, room: str) -> set[str]:
        used = outside(imports(path))
        return {library for library in used if room not in ONLY_IN.get(library, ROOMS)} | used - LIBRARIES.get(
            room, used
        )

    assert found(strangers) == {}


def test_no_library_is_loaded_before_it_is_used() -> None:
    def early(path: Path, room: str) -> set[str]:
        names = early_imports(path)
        heavy = {name for name in names for slow in NEVER_EARLY if f"{name}.".startswith(f"{slow}.")}
        return heavy | {library for library in outside(names) if room not in EARLY.get(library, ())}

    assert found(early) == {}


@pytest.mark.parametrize(
    ("source", "names"),
    [
        ("from electrolog import units", ["electrolog.units"]),
        ("import scipy.stats", ["scipy.stats"]),
        ("try:\n    import pandas\nexcept ImportError:\n    pass", ["pandas"]),
        ("class A:\n    import pandas", ["pandas"]),
        ("def f():\n    import pandas", []),
        ("from typing import TYPE_CHECKING\nif TYPE_CHECKING:\n    import pandas", ["typing.TYPE_CHECKING"]),
    ],
)
def test_an_early_import_is_seen_for_what_it_is(source: str, names: list[str]) -> None:
    assert [name for node in run_on_import(ast.parse(source)) for name in imported(node)] == names


def loaded_by(code: str) -> set[str]:
    """Every module in a fresh interpreter after `code`, whatever it prints and however it ends."""
    program = (
        f"import sys\ntry:\n    {code}\nfinally:\n    sys.stdout.flush()\n    print(*sys.modules, file=sys.stderr)"
    )
    done = subprocess.run([sys.executable, "-c", program], check=False, capture_output=True, encoding="utf-8", cwd=ROOT)
    assert done.returncode == 0, done.stderr[-2000:]
    return set(done.stderr.split())


def test_help_loads_no_heavy_library() -> None:
    if importlib.util.find_spec("electrolog.cli.main") is None:
        pytest.skip("electrolog/cli/main.py is not there yet")
    loaded = loaded_by("sys.argv = ['electrolog', '--help']; from electrolog.cli.main import run; run()")
    assert "electrolog.cli.main" in loaded
    assert loaded & {"alembic", "matplotlib", "numpy", "pandas", "scipy", "sqlalchemy"} == set()


def test_all_modules_together_load_nothing_that_is_slow() -> None:
    names = [short(path).removesuffix(".py").removesuffix("/__init__").replace("/", ".") for path in MODULES]
    names = [name for name in names if not name.endswith("__main__")]
    loaded = loaded_by(f"import {', '.join(names)}")
    assert loaded >= set(names)
    assert loaded & set(NEVER_EARLY) == set()


def test_top_level_is_as_promised() -> None:
    if not (ROOT / ".git").exists() or shutil.which("git") is None:
        pytest.skip("not a git checkout, so that nothing says which files belong to it")
    listed = subprocess.run(["git", "ls-files", "-z"], check=False, capture_output=True, encoding="utf-8", cwd=ROOT)
    if listed.returncode:
        pytest.skip(f"git does not answer here: {listed.stderr.strip()}")
    assert {name.partition("/")[0] for name in listed.stdout.split("\0") if name} == PROMISED
