"""Who may do what on a server, tried by real logins past everything that the program itself would refuse."""

from __future__ import annotations

import subprocess
import sys
from collections.abc import Callable
from datetime import timedelta
from itertools import count
from pathlib import Path
from typing import Any

import pytest
from sqlalchemy import create_engine, insert, make_url
from sqlalchemy.exc import DBAPIError

from electrolog.clock import utc_now
from electrolog.errors import InputError, RecordError, UnknownName
from electrolog.lab import Lab, open_lab
from electrolog.record import journal, migrate, schema

Raw = Callable[..., list[Any]]
POINTS = [(0.0, 0.1), (1.0, 12.2), (2.0, 24.0)]
NOT_ALLOWED = "42501"  # insufficient_privilege, in PostgreSQL's table of error codes
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
    """By what state of the standard's (SQLSTATE)."""
    engine = create_engine(lab.record.engine.url, isolation_level="AUTOCOMMIT")
    try:
        with pytest.raises(DBAPIError) as error, engine.connect() as connection:
            connection.exec_driver_sql(statement.replace("%", "%%"))
    finally:
        engine.dispose()
    return str(getattr(error.value.orig, "sqlstate", error.value.orig))


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


OF_NOBODY = (
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
    "CREATE TEMP TABLE journal (it integer)",  # it would be found before the real one
    "CREATE SCHEMA mine",
    "CREATE FUNCTION public.now() RETURNS timestamptz RETURN 'epoch'::timestamptz",
    "CREATE OR REPLACE FUNCTION sign_with_login() RETURNS trigger LANGUAGE plpgsql AS 'BEGIN RETURN NEW; END'",
    "DROP FUNCTION refuse_foreign_entry CASCADE",
    "ALTER FUNCTION sign_with_login() RENAME TO other",
    "CREATE TRIGGER mine BEFORE INSERT ON journal FOR EACH ROW EXECUTE FUNCTION sign_with_login()",
    "ALTER TABLE journal OWNER TO session_user",
    "SET session_replication_role = replica",
    "SET SESSION AUTHORIZATION postgres",
    "SET ROLE postgres",
    "ALTER ROLE session_user SUPERUSER",
    "ALTER SYSTEM SET fsync = off",
    "COPY journal TO PROGRAM 'cat'",
    "COPY journal TO '/journal.csv'",
    "SELECT pg_read_file('PG_VERSION')",
    "SELECT lo_import('/etc/hostname')",
    "SELECT rolpassword FROM pg_authid",
    "SELECT pg_reload_conf()",
    "BEGIN; LOCK TABLE journal IN ACCESS EXCLUSIVE MODE",
    "DROP DATABASE template1",
)
OF_A_STEWARD = (
    "UPDATE exposures SET struck = 1",
    "UPDATE exposures SET id = 99",
    "UPDATE terms SET term = 'x'",
    "INSERT INTO terms (id, kind, term) VALUES (99, 'setting', 'x')",
    "UPDATE analytes SET molar_mass_g_mol = 1",
    "INSERT INTO limits (id, rule) VALUES (1, 'accepted-risk')",
    "BEGIN; LOCK TABLE exposures IN ACCESS EXCLUSIVE MODE",
)


@pytest.mark.parametrize("role", ["read", "bench", "steward"])
def test_nobody_changes_what_is_kept(login: Callable[[str], Lab], server: Lab, role: str) -> None:
    lab = login(role)
    assert {statement: refused(lab, statement) for statement in OF_NOBODY} == dict.fromkeys(OF_NOBODY, NOT_ALLOWED)
    assert server.verify().whole


@pytest.mark.parametrize("role", ["read", "bench"])
def test_what_is_a_stewards_is_nobody_elses(login: Callable[[str], Lab], server: Lab, raw: Raw, role: str) -> None:
    lab = login(role)
    steward = f"{server.record.engine.url.database}_steward"
    name = lab.record.engine.url.username
    statements = (*OF_A_STEWARD, f"GRANT {steward} TO {name}", f"SET ROLE {steward}")
    assert {statement: refused(lab, statement) for statement in statements} == dict.fromkeys(statements, NOT_ALLOWED)
    assert server.verify().whole


def entry_of(lab: Lab, **forged: Any) -> None:
    """The next entry of the journal, rightly chained and hashed but for what is forged, past the program."""
    with lab.record.reading() as connection:
        seq, previous = journal.head(connection)
    entry = {
        "seq": seq + 1,
        "at": utc_now(),
        "who": lab.record.engine.url.username,
        "action": "add",
        "sheet": "electrodes",
        "row_id": 4711,
        "reason": "",
        "change": "{}",
        "previous_hash": previous,
    } | forged
    entry["hash"] = journal.entry_hash(entry)
    with lab.record.engine.begin() as connection:
        connection.execute(insert(schema.journal), [entry])


@pytest.mark.parametrize(
    ("forged", "said"),
    [
        ({"who": "wren"}, "comes from the login"),
        ({"at": utc_now() - timedelta(hours=1)}, "server's clock"),
        ({"at": utc_now() + timedelta(hours=1)}, "server's clock"),
        ({"seq": 4000}, "does not follow"),
        ({"previous_hash": "0" * 64}, "does not follow"),
        ({"action": "strike", "sheet": "exposures", "row_id": 1}, "permission denied"),
        ({"sheet": "limits"}, "permission denied"),
        ({"sheet": "terms"}, "permission denied"),
        ({"action": "amend", "sheet": "exposures", "row_id": 1}, "own entries of the day"),
    ],
)
def test_the_bench_forges_no_entry(login: Callable[[str], Lab], server: Lab, forged: dict[str, Any], said: str) -> None:
    bench = login("bench")
    with pytest.raises(DBAPIError, match=said):
        entry_of(bench, **forged)
    assert server.verify().whole
    entry_of(bench)  # of a probe that it never added: that is found
    assert not server.verify().whole


def test_a_clock_far_from_the_servers_is_said(login: Callable[[str], Lab], monkeypatch: pytest.MonkeyPatch) -> None:
    bench = login("bench")
    monkeypatch.setenv("ELECTROLOG_NOW", "2026-01-01T00:00:00Z")
    with pytest.raises(RecordError, match="more than ten minutes apart"):
        bench.make_probes(["NEW-1"])


def test_a_refused_batch_is_one_line(login: Callable[[str], Lab]) -> None:
    where = login("read").record.engine.url.render_as_string(False)
    command = [sys.executable, "-m", "electrolog", "--db", where, "new", "A1", "A2", "A3"]
    done = subprocess.run(command, capture_output=True, encoding="utf-8", check=False, timeout=120)
    assert (done.returncode, done.stdout, done.stderr.count("\n")) == (1, "", 1), done.stderr


def test_a_stranger_does_not_even_get_in(login: Callable[[str], Lab], server: Lab, raw: Raw) -> None:
    login("read")
    raw(server, "CREATE ROLE stranger LOGIN")
    with pytest.raises(RecordError, match="may not do that"):
        open_lab(make_url(server.record.engine.url).set(username="stranger").render_as_string(False))


def test_roles_hold_for_a_table_that_a_later_migration_brings(
    login: Callable[[str], Lab], server: Lab, raw: Raw
) -> None:
    reader, bench = login("read"), login("bench")
    migrate.to_revision(server.record, "0002")
    raw(server, "GRANT SELECT ON kept_fits TO PUBLIC")
    migrate.to_revision(server.record, schema.REVISION)
    made = bench.cohort_fit("dopamine")
    assert reader.cohort_fit("dopamine").made_at == made.made_at
    assert refused(reader, "DELETE FROM kept_fit_units") == NOT_ALLOWED


def test_the_roles_can_be_made_again(server: Lab) -> None:
    assert server.roles({}) == server.roles({})
