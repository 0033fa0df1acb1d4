"""Who may do what on a server, tried by real logins past everything that the program itself would refuse."""

from __future__ import annotations

from collections.abc import Callable
from itertools import count
from pathlib import Path
from typing import Any

import pytest
from sqlalchemy import create_engine, make_url, text
from sqlalchemy.exc import DBAPIError

from electrolog.errors import InputError, RecordError, UnknownName
from electrolog.lab import Lab, open_lab

Raw = Callable[..., list[Any]]
POINTS = [(0.0, 0.1), (1.0, 12.2), (2.0, 24.0)]
_numbers = count(1)


@pytest.fixture
def engine_name() -> str:
    """A file knows no logins."""
    return "postgresql"


@pytest.fixture
def server(lived_in: Lab) -> Lab:
    return lived_in


@pytest.fixture
def login(server: Lab, raw: Raw) -> Callable[[str], Lab]:
    """A login admitted to a role, as a lab that it opened."""
    made = {}

    def admitted(role: str) -> Lab:
        name = f"{role}{next(_numbers)}"
        raw(server, f"CREATE ROLE {name} LOGIN")
        assert name in server.roles({name: role}).holders[role]
        made[name] = open_lab(make_url(server.record.engine.url).set(username=name).render_as_string(False))
        return made[name]

    return admitted


def refused(lab: Lab, statement: str) -> str:
    engine = create_engine(lab.record.engine.url)
    try:
        with pytest.raises(DBAPIError) as error, engine.begin() as connection:
            connection.execute(text(statement))
    finally:
        engine.dispose()
    return str(error.value.orig)


def test_a_file_knows_no_roles(empty_file: Path) -> None:
    with pytest.raises(InputError, match="knows no roles"):
        open_lab(str(empty_file)).roles({})


def test_a_role_or_login_that_is_not_there_is_refused(server: Lab) -> None:
    with pytest.raises(UnknownName, match="no role is called 'chief'"):
        server.roles({"postgres": "chief"})
    with pytest.raises(InputError, match="no login 'nobody-of-that-name'"):
        server.roles({"nobody-of-that-name": "read"})


def test_read_asks_and_writes_nothing(login: Callable[[str], Lab], raw: Raw) -> None:
    reader = login("read")
    assert {row["electrode"] for row in reader.rows("electrodes")} == {"B1-01", "B1-02"}
    assert reader.verify().whole
    assert reader.readings(["B1-01"])
    assert not reader.record.may_keep
    for entry in (lambda: reader.make_probes(["X"]), lambda: reader.amend("exposure", "1", {"note": "x"}, "why")):
        with pytest.raises(RecordError, match="may not do that"):
            entry()
    assert reader.verify().whole


def test_bench_logs_under_its_own_name_and_no_other(login: Callable[[str], Lab], server: Lab) -> None:
    bench = login("bench")
    bench.make_probes(["NEW-1"])
    name = bench.record.engine.url.username
    assert bench.journal()[-1].who == name
    forger = open_lab(bench.record.engine.url.render_as_string(False), who="wren")
    with pytest.raises(RecordError, match="comes from the login"):
        forger.make_probes(["NEW-2"])
    assert server.verify().whole


def test_bench_amends_its_own_of_the_day_only(login: Callable[[str], Lab], server: Lab) -> None:
    bench, other = login("bench"), login("bench")
    run = {"start": "2026-02-08T09:00Z", "duration_min": "4h", "setting": "in-vivo"}
    bench.log("exposures", ["B1-02"], run)
    assert bench.amend("exposure", "2", {"duration_min": "3h"}, "typed wrong").changes
    for lab, number in ((other, "2"), (bench, "1")):
        with pytest.raises(RecordError, match="own entries of the day"):
            lab.amend("exposure", number, {"duration_min": "2h"}, "not mine", confirmed=True)
    with pytest.raises(RecordError, match="may not do that"):
        bench.strike("exposure", "2", "never happened")
    assert server.verify().whole


def test_limits_words_and_strikes_are_a_stewards(login: Callable[[str], Lab], server: Lab) -> None:
    bench, steward = login("bench"), login("steward")
    word = {"kind": "setting", "term": "gel"}
    for entry in (lambda: bench.log_plain("terms", word), lambda: bench.set_limit("accepted-risk", "5%")):
        with pytest.raises(RecordError, match="may not do that"):
            entry()
    steward.log_plain("terms", word)
    steward.set_limit("accepted-risk", "5%")
    steward.strike("cleaning", "1", "never happened")
    steward.amend("exposure", "1", {"duration_min": "3h"}, "typed wrong")
    assert {entry.who for entry in server.journal()[-4:]} == {steward.record.engine.url.username}
    assert server.verify().whole


def test_a_steward_admits_to_the_bench(login: Callable[[str], Lab], server: Lab, raw: Raw) -> None:
    steward, bench = login("steward"), login("bench")
    raw(server, "CREATE ROLE newcomer LOGIN")
    assert "newcomer" in steward.roles({"newcomer": "bench"}).holders["bench"]
    with pytest.raises(RecordError, match="may not do that"):
        bench.roles({"newcomer": "steward"})


@pytest.mark.parametrize("role", ["read", "bench", "steward"])
@pytest.mark.parametrize(
    "statement",
    [
        "DELETE FROM exposures",
        "TRUNCATE journal",
        "UPDATE journal SET reason = 'x'",
        "DELETE FROM journal",
        "ALTER TABLE exposures DISABLE TRIGGER ALL",
        "DROP TABLE calibration_figures",
        "DROP TRIGGER guard_journal ON journal",
        "CREATE TABLE mine (it integer)",
        "UPDATE alembic_version SET version_num = '9'",
        "CREATE ROLE helper SUPERUSER",
    ],
)
def test_nobody_changes_what_is_kept(login: Callable[[str], Lab], role: str, statement: str) -> None:
    said = refused(login(role), statement)
    assert "permission denied" in said or "must be owner" in said


def test_a_stranger_does_not_even_get_in(login: Callable[[str], Lab], server: Lab, raw: Raw) -> None:
    login("read")
    raw(server, "CREATE ROLE stranger LOGIN")
    with pytest.raises(RecordError, match="may not do that"):
        open_lab(make_url(server.record.engine.url).set(username="stranger").render_as_string(False))


def test_the_roles_can_be_made_again(server: Lab) -> None:
    assert server.roles({}) == server.roles({})
