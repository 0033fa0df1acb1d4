"""The kept fit of a cohort, as it was kept or not at all."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from sqlalchemy import Connection, Select, select
from sqlalchemy.exc import OperationalError

from electrolog.clock import utc_now
from electrolog.errors import DataError
from electrolog.record import schema, sheets
from electrolog.record.journal import Writer, insert_columns
from electrolog.record.seen_by_fit import Seen

MOST_NAMED = 500  # units in one question; whoever asks about more is given all
_SEEN = ("seen_readings", "seen_newest", "seen_correction")


@dataclass(frozen=True)
class KeptFit:
    method: str
    fingerprint: str
    seen: Seen
    made_at: datetime


@dataclass(frozen=True)
class Sealed:
    """A fit ready to be kept: its row, and each unit's. Made beforehand, or everybody would wait for it to write."""

    row: Mapping[str, Any]
    units: Mapping[str, str]


def kept_fit(connection: Connection, analyte_id: int) -> KeptFit | None:
    """Without the fit itself, which is large. None where there is none that can be read."""
    table = schema.kept_fits
    columns = [table.c[name] for name in ("method", "fingerprint", *_SEEN, "made_at")]
    found = _readable(connection, select(*columns).where(table.c.analyte_id == analyte_id))
    if not found:
        return None
    row = found[0]
    return KeptFit(row["method"], row["fingerprint"], _seen_of(row), row["made_at"])


def content(connection: Connection, analyte_id: int, units: Collection[str] | None = None) -> dict[str, Any]:
    """The kept fit itself, as plain data: what is shared, and the named units' own, of all where None are named.

    Raises DataError where it isn't as it was kept: a bit that flipped would give another forecast, and nothing would
    show it.
    """
    table, own = schema.kept_fits, schema.kept_fit_units.c
    rows = _readable(connection, select(table).where(table.c.analyte_id == analyte_id))
    query = select(own.unit, own.fit).where(own.analyte_id == analyte_id)
    if units is not None and len(units) <= MOST_NAMED:
        query = query.where(own.unit.in_(units))
    parts = _readable(connection, query)
    if not rows or parts is None or not _is_whole(rows[0]) or not _are_whole(rows[0], parts):
        raise DataError("the kept fit isn't what was kept", "fit the cohort again")
    told = json.loads(_text(rows[0]["fit"]))
    found = {part["unit"]: json.loads(_text(part["fit"])) for part in parts}
    wanted = set(told["units"]) if units is None else set(told["units"]) & set(units)
    if not wanted <= found.keys():  # one that went astray would pass for one that the fit has never seen
        raise DataError("the kept fit isn't all there", "fit the cohort again")
    return {"shared": told["shared"], "units": found}


def changed(connection: Connection, method: str) -> list[str]:
    """The analytes whose fit, kept by this method, isn't as it was kept."""
    table, analytes = schema.kept_fits, schema.tables[sheets.ANALYTES.name].c
    found = []
    for analyte_id in connection.execute(select(table.c.analyte_id)).scalars().all():
        kept = kept_fit(connection, analyte_id)
        if kept is not None and kept.method != method:
            continue
        try:
            content(connection, analyte_id)
        except DataError:
            found.append(str(connection.execute(select(analytes.analyte).where(analytes.id == analyte_id)).scalar()))
    return found


def sealed(analyte_id: int, method: str, fingerprint: str, seen: Seen, fit: Mapping[str, Any]) -> Sealed:
    """fit: what all units share under "shared", each one's own under "units" by its label."""
    row = {
        "analyte_id": analyte_id,
        "method": method,
        "fingerprint": fingerprint,
        "seen_readings": seen.readings,
        "seen_newest": seen.newest,
        "seen_correction": seen.correction,
        "made_at": utc_now(),
    }
    told = json.dumps({"units": list(fit["units"]), "shared": fit["shared"]}, allow_nan=False)
    shared = _hashed(_said(row), told)
    own = {unit: json.dumps(part, allow_nan=False) for unit, part in fit["units"].items()}
    units = {unit: _hashed(_hash(shared) + unit, text) for unit, text in own.items()}
    return Sealed(row | {"fit": shared}, units)


def keep_fit(writer: Writer, fit: Sealed) -> None:
    """In place of the one kept before; of two machines that fitted at once, what had seen more is kept."""
    analyte_id = fit.row["analyte_id"]
    if _had_seen_more(writer.connection, fit):
        return
    for table in (schema.kept_fits, schema.kept_fit_units):
        writer.connection.execute(table.delete().where(table.c.analyte_id == analyte_id))
    writer.connection.execute(schema.kept_fits.insert().values(fit.row))
    if fit.units:
        of: list[Any] = [analyte_id] * len(fit.units)
        columns = {"analyte_id": of, "unit": [*fit.units], "fit": [*fit.units.values()]}
        insert_columns(writer.connection, schema.kept_fit_units, columns)


def _had_seen_more(connection: Connection, fit: Sealed) -> bool:
    """Whether the fit that stands there did, and is whole: what is spoilt says so of itself in vain."""
    table = schema.kept_fits
    before = _readable(connection, select(table).where(table.c.analyte_id == fit.row["analyte_id"]))
    if not before or before[0]["method"] != fit.row["method"] or not _is_whole(before[0]):
        return False
    return not _as_much(_seen_of(fit.row), _seen_of(before[0]))


def _seen_of(row: Mapping[str, Any]) -> Seen:
    return Seen(row["seen_readings"], row["seen_newest"] or 0, row["seen_correction"])


def _readable(connection: Connection, query: Select[Any]) -> list[Mapping[str, Any]] | None:
    """None where a bit has flipped so that what stands there is no text any more, or no moment."""
    try:
        return [dict(row) for row in connection.execute(query).mappings()]
    except (OperationalError, ValueError):
        return None


def _said(row: Mapping[str, Any]) -> str:
    """What the fit's own hash is also over."""
    plain = [row[name] for name in ("analyte_id", "method", "fingerprint", *_SEEN)]
    return json.dumps([*plain, schema.fixed_width(row["made_at"])])


def _hashed(said: str, text: str) -> str:
    """The text after its own hash, and that of what stands elsewhere and belongs to it."""
    return hashlib.sha256(f"{said}{text}".encode()).hexdigest() + text


def _hash(kept: str) -> str:
    return kept[:64]


def _text(kept: str) -> str:
    return kept[64:]


def _is_whole(row: Mapping[str, Any]) -> bool:
    return bool(row["fit"] == _hashed(_said(row), _text(row["fit"])))


def _are_whole(row: Mapping[str, Any], parts: Sequence[Mapping[str, Any]]) -> bool:
    of = _hash(row["fit"])
    return all(part["fit"] == _hashed(of + part["unit"], _text(part["fit"])) for part in parts)


def _as_much(seen: Seen, before: Seen) -> bool:
    """A correction may have struck what was the newest, so it goes first."""
    return (seen.correction, seen.newest) >= (before.correction, before.newest)
