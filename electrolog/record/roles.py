"""Who may do what in a shared record, held by the database itself: each role with no more than it needs."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from sqlalchemy import Connection, text

from electrolog.errors import InputError, unknown
from electrolog.record import schema, sheets
from electrolog.record.store import Record

READ, BENCH, STEWARD = ROLES = ("read", "bench", "steward")
_LABS_OWN = (sheets.TERMS, sheets.ANALYTES, sheets.WAVEFORMS, sheets.LIMITS)  # its words and demands: a steward's
_DERIVED = tuple(table.name for table in (schema.calibration_figures, schema.kept_fits, schema.kept_fit_units))
_LONGEST = 63 - len("_steward")  # PostgreSQL cuts a longer name off

# Whoever is no owner: who, when and where in the chain are the server's to say, and what, as far as the role goes.
_OWN_NAME = """
CREATE OR REPLACE FUNCTION sign_with_login() RETURNS trigger LANGUAGE plpgsql
SET search_path = pg_catalog, public, pg_temp AS $$
DECLARE
  last record;
BEGIN
  IF pg_has_role(session_user, (SELECT relowner FROM pg_class WHERE oid = TG_RELID), 'MEMBER') THEN
    RETURN NEW;
  END IF;
  IF NEW.who IS DISTINCT FROM session_user::text THEN
    RAISE EXCEPTION 'who did it comes from the login: % is not %', session_user, NEW.who;
  END IF;
  IF NEW.at NOT BETWEEN now() - interval '10 minutes' AND now() + interval '10 minutes' THEN
    RAISE EXCEPTION 'the entry is of %, the server''s clock stands at %', NEW.at, now();
  END IF;
  SELECT seq, hash INTO last FROM journal ORDER BY seq DESC LIMIT 1;
  IF NEW.seq IS DISTINCT FROM last.seq + 1 OR NEW.previous_hash IS DISTINCT FROM last.hash THEN
    RAISE EXCEPTION 'entry % does not follow the newest one', NEW.seq;
  END IF;
  IF NOT pg_has_role(session_user, '{steward}', 'MEMBER') AND (NEW.action = 'strike' OR NEW.sheet IN ({labs_own})) THEN
    RAISE EXCEPTION 'permission denied for the entry: % %', NEW.action, NEW.sheet;
  END IF;
  IF NEW.action = 'amend' AND NOT (pg_has_role(session_user, '{steward}', 'MEMBER') OR EXISTS (
    SELECT FROM journal WHERE sheet = replace(NEW.sheet, 'calibration_points', 'calibrations')
      AND row_id = NEW.row_id AND action = 'add' AND who = session_user::text AND at > now() - interval '1 day'
  )) THEN
    RAISE EXCEPTION 'the bench amends its own entries of the day';
  END IF;
  RETURN NEW;
END $$
"""
_OWN_ENTRY = """
CREATE OR REPLACE FUNCTION refuse_foreign_entry() RETURNS trigger LANGUAGE plpgsql
SET search_path = pg_catalog, public, pg_temp AS $$
BEGIN
  IF pg_has_role(session_user, '{steward}', 'MEMBER') OR EXISTS (
    SELECT FROM journal WHERE sheet = replace(TG_TABLE_NAME, 'calibration_points', 'calibrations')
      AND row_id = coalesce(to_jsonb(OLD) ->> 'id', to_jsonb(OLD) ->> 'calibration_id')::integer
      AND action = 'add' AND who = session_user::text AND at > now() - interval '1 day'
  ) THEN RETURN NEW; END IF;
  RAISE EXCEPTION 'the bench amends its own entries of the day';
END $$
"""


@dataclass(frozen=True)
class Roles:
    """Of each role, the logins that hold it."""

    holders: dict[str, tuple[str, ...]]


def make(record: Record, logins: Mapping[str, str]) -> Roles:
    """Makes the roles, or makes them anew, and admits logins (login -> role); the record's owner or a steward may.

    Raises InputError for a file, which knows no logins, and for a login or role that isn't there.
    """
    if record.is_file:
        raise InputError(
            "a record in a file knows no roles: whoever may write the file may write the record;"
            " accepted: a record on a PostgreSQL server (`electrolog move` brings this one there)"
        )
    for role in logins.values():
        if role not in ROLES:
            raise unknown("role", role, ROLES)
    with record.changing() as connection:
        database = _database(connection)
        if _owns(connection):
            _make_roles(connection, database)
            _grant(connection, database)
            _guard(connection, database)
        for login, role in logins.items():
            _admit(connection, login, f"{database}_{role}")
        return Roles({role: _holders(connection, f"{database}_{role}") for role in ROLES})


def _database(connection: Connection) -> str:
    """Roles belong to the whole server, so their names begin with the database's: another lab's bench is not ours."""
    name = str(connection.execute(text("SELECT current_database()")).scalar_one())
    if len(name.encode()) > _LONGEST:
        raise InputError(f"the database's name '{name}' is too long to name roles by; accepted: up to {_LONGEST} signs")
    return name


def _owns(connection: Connection) -> bool:
    owned = "SELECT pg_has_role(session_user, relowner, 'MEMBER') FROM pg_class WHERE oid = 'journal'::regclass"
    return bool(connection.execute(text(owned)).scalar())


def _make_roles(connection: Connection, database: str) -> None:
    for role in ROLES:
        name = f"{database}_{role}"
        if not _is_there(connection, name):
            _run(connection, f"CREATE ROLE {_quoted(name)} NOLOGIN")
    read, bench, steward = (_quoted(f"{database}_{role}") for role in ROLES)
    _run(connection, f"GRANT {read} TO {bench}")
    _run(connection, f"GRANT {read}, {bench} TO {steward} WITH ADMIN OPTION")


def _grant(connection: Connection, database: str) -> None:
    read, bench, steward = (_quoted(f"{database}_{role}") for role in ROLES)
    place = _quoted(database)
    everything = ", ".join([schema.journal.name, *schema.tables, *_DERIVED, schema.alembic_version.name])
    logged = ", ".join(sheet.name for sheet in sheets.SHEETS if sheet not in _LABS_OWN)
    _run(connection, f"REVOKE ALL ON DATABASE {place} FROM PUBLIC")
    _run(connection, "REVOKE ALL ON SCHEMA public FROM PUBLIC")
    _run(connection, f"REVOKE ALL ON {everything} FROM PUBLIC, {read}, {bench}, {steward}")
    _run(connection, f"GRANT CONNECT ON DATABASE {place} TO {read}")
    _run(connection, f"GRANT USAGE ON SCHEMA public TO {read}")
    _run(connection, f"GRANT SELECT ON {everything} TO {read}")
    _run(connection, f"GRANT INSERT ON {schema.journal.name}, {logged} TO {bench}")
    _run(connection, f"GRANT INSERT, UPDATE, DELETE ON {', '.join(_DERIVED)} TO {bench}")
    for sheet in sheets.SHEETS:
        if sheet not in _LABS_OWN:
            columns = ", ".join(schema.column_name(column) for column in sheet.columns)
            _run(connection, f"GRANT UPDATE ({columns}) ON {sheet.name} TO {bench}")
    _run(connection, f"GRANT INSERT, UPDATE ON {', '.join(schema.tables)} TO {steward}")


def _guard(connection: Connection, database: str) -> None:
    steward = f"{database}_{STEWARD}".replace("'", "''")
    labs_own = ", ".join(f"'{sheet.name}'" for sheet in _LABS_OWN)
    for function in (_OWN_NAME, _OWN_ENTRY):
        _run(connection, function.replace("{steward}", steward).replace("{labs_own}", labs_own))
    _run(
        connection,
        "CREATE OR REPLACE TRIGGER own_name BEFORE INSERT ON journal FOR EACH ROW EXECUTE FUNCTION sign_with_login()",
    )
    for name in schema.tables:
        _run(
            connection,
            f"CREATE OR REPLACE TRIGGER own_entry BEFORE UPDATE ON {name}"
            " FOR EACH ROW EXECUTE FUNCTION refuse_foreign_entry()",
        )


def _admit(connection: Connection, login: str, role: str) -> None:
    if not _is_there(connection, login):
        raise InputError(
            f"the server knows no login '{login}'; accepted: one that is there",
            "its administrator makes one: createuser --pwprompt LOGIN",
        )
    _run(connection, f"GRANT {_quoted(role)} TO {_quoted(login)}")


def _holders(connection: Connection, role: str) -> tuple[str, ...]:
    held = text(
        "SELECT member.rolname FROM pg_auth_members JOIN pg_roles AS member ON member.oid = pg_auth_members.member"
        " JOIN pg_roles AS held ON held.oid = pg_auth_members.roleid"
        " WHERE held.rolname = :role AND member.rolcanlogin ORDER BY 1"
    )
    return tuple(dict.fromkeys(connection.execute(held, {"role": role}).scalars()))


def _is_there(connection: Connection, name: str) -> bool:
    found = connection.execute(text("SELECT FROM pg_roles WHERE rolname = :name"), {"name": name})
    return found.first() is not None


def _quoted(name: str) -> str:
    return '"' + name.replace('"', '""') + '"'


def _run(connection: Connection, statement: str) -> None:
    connection.exec_driver_sql(statement.replace("%", "%%"))  # the driver would look for a parameter there
