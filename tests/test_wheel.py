"""The built wheel where people install it: the source out of reach, and nothing there that it doesn't declare."""

from __future__ import annotations

import ast
import json
import os
import sqlite3
import subprocess
import sys
import sysconfig
import zipfile
from collections.abc import Iterator
from contextlib import closing
from importlib.metadata import Distribution, PathDistribution, distribution, packages_distributions
from pathlib import Path

import pytest
from packaging.requirements import Requirement
from packaging.utils import canonicalize_name

ROOT = Path(__file__).resolve().parents[1]
PROGRAMS = "Scripts" if os.name == "nt" else "bin"

# The dependencies are those of the environment that runs the tests, not fetched again; all else in it is refused.
ONLY_DECLARED = """
import sys

class Undeclared:
    @staticmethod
    def find_spec(name, path=None, target=None):
        if name.partition(".")[0] in {undeclared!r}:
            raise ModuleNotFoundError(name + " is not among the declared dependencies", name=name)

sys.meta_path.insert(0, Undeclared)
sys.path.extend({folders!r})
"""


def run(*command: str | Path, cwd: Path, **variables: str) -> subprocess.CompletedProcess[str]:
    kept = {name: value for name, value in os.environ.items() if not name.startswith(("PYTHON", "ELECTROLOG"))}
    return subprocess.run(
        [str(part) for part in command],
        check=False,
        capture_output=True,
        encoding="utf-8",
        cwd=cwd,
        env=kept | {"PYTHONUTF8": "1"} | variables,
    )


def declared_by(package: Distribution, extras: tuple[str, ...] = ("",)) -> Iterator[str]:
    """The names of all distributions that come with `package`."""
    for text in package.requires or []:
        needed = Requirement(text)
        if needed.marker is None or any(needed.marker.evaluate({"extra": extra}) for extra in extras):
            yield canonicalize_name(needed.name)
            yield from declared_by(distribution(needed.name), ("", *needed.extras))


def metadata_of(wheel: Path) -> Distribution:
    (folder,) = (folder for folder in zipfile.Path(wheel).iterdir() if folder.name.endswith(".dist-info"))
    return PathDistribution(folder)


def of_the_extras(wheel: Path) -> set[str]:
    """Libraries that a user may add, imported where they are used; what tests need is no part of it."""
    needed = [Requirement(text) for text in metadata_of(wheel).requires or []]
    markers = [(one.name.replace("-", "_"), str(one.marker)) for one in needed if one.marker]
    return {name for name, marker in markers if "extra" in marker and '"tests"' not in marker}


def undeclared_by(wheel: Path) -> set[str]:
    """Modules that are importable here and that the wheel doesn't bring along."""
    declared = {"electrolog", *declared_by(metadata_of(wheel))}
    modules = packages_distributions().items()
    return {module for module, names in modules if declared.isdisjoint(map(canonicalize_name, names))}


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("wheel")
    options = ("--no-deps", "--no-index", "--no-build-isolation", "--wheel-dir", folder)
    built = run(sys.executable, "-m", "pip", "wheel", *options, ROOT, cwd=folder)
    assert built.returncode == 0, built.stderr
    (made,) = folder.glob("*.whl")
    return made


@pytest.fixture(scope="module")
def programs(wheel: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The folder of `python` and `electrolog` in an environment that has the wheel."""
    venv = tmp_path_factory.mktemp("installed") / "venv"
    made = run(sys.executable, "-m", "venv", "--without-pip", venv, cwd=venv.parent)
    assert made.returncode == 0, made.stderr
    python = venv / PROGRAMS / "python"
    options = ("install", "--no-deps", "--no-index", "--no-user", wheel)
    installed = run(sys.executable, "-m", "pip", "--python", python, *options, cwd=venv.parent)
    assert installed.returncode == 0, installed.stderr
    (site,) = {path.parent for path in venv.rglob("electrolog/__init__.py")}
    folders = sorted({sysconfig.get_path("purelib"), sysconfig.get_path("platlib")})
    code = ONLY_DECLARED.format(undeclared=undeclared_by(wheel), folders=folders)
    (site.parent / "only_declared.py").write_text(code, encoding="utf-8")
    (site.parent / "only_declared.pth").write_text("import only_declared\n", encoding="ascii")
    return venv / PROGRAMS


@pytest.fixture
def program(programs: Path) -> Path:
    if not (ROOT / "electrolog" / "cli" / "main.py").is_file():
        pytest.skip("electrolog/cli/main.py is not there yet")
    return programs / "electrolog"


def test_wheel_holds_the_package_and_its_migrations_and_nothing_else(wheel: Path) -> None:
    names = {name for name in zipfile.ZipFile(wheel).namelist() if ".dist-info/" not in name}
    source = {path.relative_to(ROOT).as_posix() for path in (ROOT / "electrolog").rglob("*.py")}
    migrations = {f"electrolog/migrations/{path.name}" for path in (ROOT / "migrations").glob("*.*")}
    versions = {f"electrolog/migrations/versions/{path.name}" for path in (ROOT / "migrations/versions").glob("*.py")}
    templates = {f"electrolog/show/templates/{path.name}" for path in (ROOT / "electrolog/show/templates").iterdir()}
    assert len(versions) >= 1
    assert len(templates) >= 1
    assert source | migrations | versions | templates <= names
    assert {name.partition("/")[0] for name in names} == {"electrolog"}


def test_every_library_in_the_source_is_declared(wheel: Path) -> None:
    used = {
        name.partition(".")[0]
        for path in (ROOT / "electrolog").rglob("*.py")
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8")))
        for name in ([n.name for n in node.names] if isinstance(node, ast.Import) else [getattr(node, "module", None)])
        if name
    }
    assert "sqlalchemy" in used
    assert used & undeclared_by(wheel) - of_the_extras(wheel) == set()


def test_every_module_loads_from_the_wheel_alone(programs: Path, tmp_path: Path) -> None:
    code = """if True:
        import importlib, json, pkgutil, sys, electrolog
        names = [module.name for module in pkgutil.walk_packages(electrolog.__path__, "electrolog.")]
        names = [name for name in names if ".migrations" not in name and not name.endswith("__main__")]
        print(json.dumps({name: importlib.import_module(name).__file__ for name in names}))
    """
    loaded = run(programs / "python", "-c", code, cwd=tmp_path)
    assert loaded.returncode == 0, loaded.stderr
    files = json.loads(loaded.stdout)
    assert "electrolog.record.store" in files
    assert {name for name, file in files.items() if not Path(file).is_relative_to(programs.parent)} == set()


def test_undeclared_libraries_are_out_of_reach(programs: Path, tmp_path: Path) -> None:
    """Or the tests around this one would prove nothing."""
    assert run(programs / "python", "-c", "import sqlalchemy", cwd=tmp_path).returncode == 0
    assert "not among the declared" in run(programs / "python", "-c", "import pytest", cwd=tmp_path).stderr


def test_setup_makes_a_database_and_migrates_it(program: Path, tmp_path: Path) -> None:
    from electrolog.record import schema

    made = run(program, "--db", tmp_path / "made here.db", "setup", cwd=tmp_path)
    assert made.returncode == 0, made.stderr
    with closing(sqlite3.connect(tmp_path / "made here.db")) as database:
        assert database.execute("SELECT version_num FROM alembic_version").fetchall() == [(schema.REVISION,)]
        tables = {name for (name,) in database.execute("SELECT name FROM sqlite_master WHERE type = 'table'")}
    assert tables >= {table.name for table in schema.metadata.tables.values()}


def test_setup_a_second_time_changes_nothing(program: Path, tmp_path: Path) -> None:
    assert [run(program, "--db", tmp_path / "x.db", "setup", cwd=tmp_path).returncode for _ in range(2)] == [0, 0]


def test_help_starts_from_the_wheel_alone(program: Path, tmp_path: Path) -> None:
    shown = run(program, "--help", cwd=tmp_path)
    assert (shown.returncode, shown.stderr) == (0, "")
    assert "electrolog" in shown.stdout
