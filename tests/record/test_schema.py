"""The database a migration makes is the one the schema describes, constraint by constraint, on both engines."""

from __future__ import annotations

import re
from typing import Any

import pytest
from alembic.autogenerate import compare_metadata
from alembic.migration import MigrationContext
from sqlalchemy import Engine, inspect

from electrolog.lab import Lab
from electrolog.record import migrate, schema
from electrolog.record.constraints import full_metadata
from electrolog.record.store import connected

# SQLAlchemy can't read an index on an expression back from SQLite; `indexes` below compares these.
pytestmark = pytest.mark.filterwarnings("ignore:.*expression-based index")


def test_the_schemas_revision_is_the_newest_migration() -> None:
    assert migrate.newest_revision() == schema.REVISION


def test_a_fresh_record_is_what_the_schema_describes(lab: Lab) -> None:
    with lab.record.engine.connect() as connection:
        context = MigrationContext.configure(connection, opts={"compare_server_default": True})
        assert compare_metadata(context, full_metadata()) == []


def test_constraints_and_indexes_are_the_same_by_name_and_rule(lab: Lab, blank: str) -> None:
    described = connected(blank).engine
    full_metadata().create_all(described)
    assert guards(lab.record.engine) == guards(described)
    assert indexes(lab.record.engine) == indexes(described)


def indexes(engine: Engine) -> set[str]:
    """Their own words: SQLAlchemy does not read an expression back from SQLite."""
    sqlite = "SELECT sql FROM sqlite_master WHERE type = 'index' AND sql IS NOT NULL"
    other = "SELECT indexdef FROM pg_indexes WHERE schemaname = 'public' AND indexname <> 'alembic_version_pkc'"
    with engine.connect() as connection:
        found = connection.exec_driver_sql(sqlite if engine.dialect.name == "sqlite" else other)
        return {plain(row[0]) for row in found}


def guards(engine: Engine) -> dict[str, Any]:
    """Everything that holds a row to its rules, by table."""
    looked = inspect(engine)
    return {
        table: {
            "checks": {check["name"]: plain(check["sqltext"]) for check in looked.get_check_constraints(table)},
            "keys": {
                key["name"]: (key["constrained_columns"], key["referred_table"], key["referred_columns"])
                for key in looked.get_foreign_keys(table)
            },
            "unique": {one["name"]: one["column_names"] for one in looked.get_unique_constraints(table)},
            "primary": looked.get_pk_constraint(table),
            "columns": {c["name"]: (str(c["type"]), c["nullable"]) for c in looked.get_columns(table)},
        }
        for table in looked.get_table_names()
        if table != "alembic_version"
    }


def plain(rule: str) -> str:
    return re.sub(r"\s+", " ", rule)


def test_every_constraint_has_a_name(lab: Lab) -> None:
    named = [
        name
        for table in guards(lab.record.engine).values()
        for kind in ("checks", "keys", "unique")
        for name in table[kind]
    ]
    assert len(named) > 100
    assert all(name and re.match(r"(ck|fk|uq)_", name) for name in named)


def test_sqlite_tables_hold_their_columns_to_their_types(lab: Lab, raw: Any) -> None:
    if not lab.record.is_file:
        pytest.skip("PostgreSQL always does")
    tables = raw(lab, "SELECT name, strict FROM pragma_table_list WHERE type = 'table' AND schema = 'main'")
    loose = {name for name, strict in tables if not strict} - {"alembic_version", "sqlite_schema"}
    assert loose == set()
