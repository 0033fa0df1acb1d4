"""A migration ended at every step: before each statement that it gives the database, and at calls in between.

    python tests/faults/migrating.py

The last migration is invented for it: a table rebuilt, rows filled in, an index. Whatever ended it, the record is as
it was or as it will be, whole; every copy made before is whole and holds what the record held; and the next `setup`
brings it up.
"""

from __future__ import annotations

import shutil
import subprocess
import sys
import tempfile
from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

from sqlalchemy import make_url, text

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from electrolog.record import migrate, schema
from electrolog.record.store import Record, connected
from electrolog.record.verify import Verification, verify

NOW = schema.REVISION
NEXT = f"{int(NOW) + 1:04d}"
INVENTED = '''
"""An invented step."""

import sqlalchemy as sa
from alembic import op

revision = "{next}"
down_revision = "{now}"


def upgrade():
    op.add_column("electrodes", sa.Column("drawer", sa.Text()))
    op.execute("UPDATE electrodes SET drawer = 'left'")
    with op.batch_alter_table("batches", recreate="auto") as table:
        table.add_column(sa.Column("drawer", sa.Text()))
        table.create_check_constraint("drawer_length", "length(drawer) < 100")
    op.create_index("ix_electrodes_drawer", "electrodes", ["drawer"])
{more}

def downgrade():
    raise NotImplementedError
'''
CHILD = """
import os, signal, sys
from pathlib import Path
from sqlalchemy import Engine, event
where, folder, how, last, revision = sys.argv[1], sys.argv[2], sys.argv[3], int(sys.argv[4]), sys.argv[5]
from electrolog.record import copying, migrate, schema
migrate.migrations_folder, schema.REVISION = lambda: Path(folder), revision
import alembic.command
seen = 0
def step(*_):
    global seen
    seen += 1
    if seen == last:
        os.kill(os.getpid(), signal.SIGKILL)
def called(frame, what, _):
    file = frame.f_code.co_filename
    if what in ("call", "c_call") and ("electrolog" in file or "alembic" in file):
        step()
if how == "statement":
    event.listen(Engine, "before_cursor_execute", step)
else:
    sys.setprofile(called)
_, what, _, copy = migrate.set_up(where)
sys.setprofile(None)
print(seen, copy or "")
"""


@dataclass
class Outcome:
    """as_it_was, brought_up: how often the record was found so after the end; copies: so many were looked at."""

    tried: int = 0
    as_it_was: int = 0
    brought_up: int = 0
    copies: int = 0
    broken: list[str] = field(default_factory=list)


def folder_with(place: Path, more: str = "") -> Path:
    """The real migrations and the invented one."""
    folder = place / "migrations"
    shutil.copytree(migrate.migrations_folder(), folder, ignore=shutil.ignore_patterns("__pycache__"))
    invented = INVENTED.format(more=more, now=NOW, next=NEXT)
    (folder / "versions" / f"{NEXT}_invented.py").write_text(invented, encoding="utf-8")
    return folder


def brought_up(where: str, folder: Path, how: str = "statement", last: int = 0) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-c", CHILD, where, str(folder), how, str(last), NEXT]
    return subprocess.run(command, capture_output=True, encoding="utf-8", check=False, timeout=120)


def state(where: str) -> tuple[str, Verification]:
    """Revision, and what `verify` finds, past the check that refuses another version's record."""
    record = connected(where)
    with record.reading() as connection:
        found = connection.execute(text("SELECT version_num FROM alembic_version")).scalar_one()
        return str(found), verify(connection)


def copies_of(record: Record) -> list[Path]:
    path = Path(record.name)
    return sorted(path.parent.glob(f"{path.name}.*.copy")) if record.is_file else []


def end_once(where: str, folder: Path, how: str, last: int, before: Verification, out: Outcome) -> None:
    out.tried += 1
    brought_up(where, folder, how, last)
    try:
        revision, found = state(where)
        assert found == before, f"the record is not what it was: {found.faults[:1]}"
        out.as_it_was += revision == NOW
        out.brought_up += revision == NEXT
        for copy in copies_of(connected(where)):
            assert state(str(copy)) == (NOW, before), f"{copy.name} is not the record as it was"
            out.copies += 1
        again = brought_up(where, folder)
        assert again.returncode == 0, again.stderr[-500:]
        assert state(where) == (NEXT, before), "the next setup did not bring it up"
    except AssertionError as why:
        out.broken.append(f"{how} {last}: {why}")


def run(fresh: Callable[[], str], calls: int) -> Outcome:
    """`fresh` gives the place of a populated record of the older revision; `calls`: ended at so many of them."""
    out = Outcome()
    with tempfile.TemporaryDirectory(ignore_cleanup_errors=True) as name:
        folder, steps = folder_with(Path(name)), Counter[str]()
        for how in ("statement", "call"):
            done = brought_up(fresh(), folder, how)
            assert done.returncode == 0, done.stderr
            steps[how] = int(done.stdout.split()[0])
        every = [("statement", last) for last in range(1, steps["statement"] + 1)]
        every += [("call", 1 + place * steps["call"] // max(calls, 1)) for place in range(calls)]
        every += [("call", steps["call"] - back) for back in range(min(calls, 3))]
        for how, last in every:
            where = fresh()
            end_once(where, folder, how, last, state(where)[1], out)
    return out


if __name__ == "__main__":
    from electrolog.lab import open_lab, set_up
    from tests.faults.servers import server
    from tests.record.conftest import live

    with tempfile.TemporaryDirectory() as place, server() as one:

        def lived(where: str) -> str:
            set_up(where)
            live(open_lab(where))
            return where

        template = lived(str(Path(place) / "template.db"))
        held = make_url(lived(one.url(one.new_database()))).database

        def file() -> str:
            folder = Path(tempfile.mkdtemp(dir=place))
            return str(shutil.copy(template, folder / "record.db"))

        print("SQLite", run(file, 60))
        print("PostgreSQL", run(lambda: one.url(one.new_database(str(held))), 30))
