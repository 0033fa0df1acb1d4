"""Standards from the balance and the flasks, their use-by, and how a stock is to be diluted."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime, tzinfo

from electrolog import units
from electrolog.answers.answer import Answer
from electrolog.answers.entering import Entered, log_plain, read
from electrolog.errors import InputError, shortened, unknown
from electrolog.measure.dilution_plan import DilutionPlan, plan_dilutions
from electrolog.measure.standards import SALTS_G_MOL, Dilution, Measured, Prepared, diluted, from_tolerance, prepared
from electrolog.measure.use_by import RULES, use_by
from electrolog.record import sheets
from electrolog.record.names import Names
from electrolog.record.readable import Row, row_by_id
from electrolog.record.store import Record
from electrolog.units import Unit

_PLUS_MINUS = re.compile(r"±|\+/-|\+-")


@dataclass(frozen=True)
class Preparation:
    """As typed: `18.96mg±0.05mg`. Either a mass with its volume, or `source`, a standard that was diluted.

    molar_mass: of what was weighed; where it is missing, the analyte's own with its `salts`. dilutions:
    `1mL:100mL` each, what was taken and what it was made up to.
    """

    mass: str | None = None
    molar_mass: str | None = None
    salts: tuple[str, ...] = ()
    purity: str | None = None
    volume: str | None = None
    source: str | None = None
    dilutions: tuple[str, ...] = ()


@dataclass(frozen=True)
class PreparedStandard(Answer):
    """What was logged; `prepared`: how its concentration came about, `usual_expiry`: the trade's use-by."""

    entered: Entered
    prepared: Prepared | None
    usual_expiry: datetime | None
    why_expiry: str | None


def log_standard(
    record: Record, typed: Mapping[str, str], how: Preparation | None, keep_usual: bool, zone: tzinfo | None
) -> PreparedStandard:
    made = None if how is None else _prepared(record, typed["analyte"], how)
    values = {**typed, **(_said(how, made) if how and made else {})}
    if how and made and typed.get("note"):
        values["note"] = f"{typed['note']}; {values['note']}"
    known = read(sheets.STANDARDS, values, zone)
    last, why = _usual_expiry(record, known)
    if keep_usual:
        if last is None:
            raise InputError(f"expires: no use-by is known for {known['analyte']}; accepted: a moment of your own")
        known["expires_at"] = last
    return PreparedStandard(log_plain(record, sheets.STANDARDS, known, zone), made, last, why)


def plan(record: Record, stock: str, wanted_um: Sequence[float], volume_ml: float, smallest_ml: float) -> DilutionPlan:
    with record.reading() as connection:
        label = Names(connection).spelled("standards", stock)
    stock_um = (
        _standard(record, stock)["concentration_um"]
        if label is not None
        else units.parse_quantity(stock, units.CONCENTRATION_UM, "stock")
    )
    return plan_dilutions(stock_um, wanted_um, volume_ml=volume_ml, smallest_ml=smallest_ml)


def measured(text: str, unit: Unit, what: str) -> Measured:
    """`18.96mg±0.05mg`: the ± is a tolerance, whose half-width becomes a standard uncertainty by √3."""
    value, *rest = _PLUS_MINUS.split(text)
    if len(rest) > 1:
        raise InputError(f"{what}: '{shortened(text)}' has more than one ±; accepted: such as {unit.example}±…")
    found = units.parse_quantity(value, unit, what)
    return from_tolerance(found, units.parse_quantity(rest[0], unit, f"{what}'s ±")) if rest else Measured(found)


def _prepared(record: Record, analyte: str, how: Preparation) -> Prepared:
    steps = [_dilution(text) for text in how.dilutions]
    if how.source is not None:
        return _from_standard(record, analyte, how, steps)
    if how.mass is None or how.volume is None:
        raise InputError(
            "concentration: missing; accepted: the concentration, --mass with --volume, or --from with --dilute"
        )
    return prepared(
        measured(how.mass, units.MASS_MG, "mass"),
        _molar_mass(record, analyte, how),
        measured(how.volume, units.VOLUME_ML, "volume"),
        purity=None if how.purity is None else measured(how.purity, units.FRACTION, "purity"),
        dilutions=steps,
    )


def _from_standard(record: Record, analyte: str, how: Preparation, steps: Sequence[Dilution]) -> Prepared:
    if not steps or how.mass is not None:
        raise InputError("from: a standard made from another is diluted; accepted: --dilute, and no --mass")
    source = _standard(record, str(how.source))
    with record.reading() as connection:
        names = Names(connection)
        alike = names.row_id("analytes", analyte) == names.row_id("analytes", source["analyte"])
    if not alike:
        raise InputError(f"from: {source['standard']} holds {source['analyte']}, not {shortened(analyte)}")
    known = Prepared(source["concentration_um"], source["relative_uncertainty"] or 0.0, ())
    return diluted(known, *steps)


def _dilution(text: str) -> Dilution:
    taken, colon, made_up = text.partition(":")
    if not colon:
        raise InputError(f"dilute: '{shortened(text)}' is no pair; accepted: taken and made up to, as in 1mL:100mL")
    return Dilution(
        measured(taken, units.VOLUME_ML, "volume taken"), measured(made_up, units.VOLUME_ML, "volume made up to")
    )


def _molar_mass(record: Record, analyte: str, how: Preparation) -> float:
    if how.molar_mass is not None:
        return units.parse_quantity(how.molar_mass, units.MOLAR_MASS_G_MOL, "molar mass")
    with record.reading() as connection:
        row = row_by_id(connection, sheets.ANALYTES, Names(connection).row_id("analytes", analyte))
    if row["molar_mass_g_mol"] is None:
        raise InputError(f"molar mass: {row['analyte']}'s isn't in the record; accepted: --molar-mass")
    for salt in how.salts:
        if salt not in SALTS_G_MOL:
            raise unknown("salt or hydrate", salt, SALTS_G_MOL, "or give --molar-mass of what was weighed")
    return float(row["molar_mass_g_mol"]) + sum(SALTS_G_MOL[salt] for salt in how.salts)


def _standard(record: Record, label: str) -> Row:
    with record.reading() as connection:
        return row_by_id(connection, sheets.STANDARDS, Names(connection).row_id("standards", label))


def _said(how: Preparation, made: Prepared) -> dict[str, str]:
    """The columns that follow, and how they came about, for the note."""
    parts = [f"from {how.source}"] if how.source else [f"weighed {how.mass} in {how.volume}"]
    parts += [f"purity {how.purity}"] if how.purity else []
    parts += [f"molar mass {how.molar_mass}"] if how.molar_mass else [*how.salts]
    parts += [f"diluted {step}" for step in how.dilutions]
    if made.budget:
        parts.append(f"uncertainty mostly from {made.budget[0][0]} ({made.budget[0][1]:.0%})")
    said = {"concentration_um": repr(made.concentration_um), "note": ", ".join(parts)}
    return said | ({"relative_uncertainty": repr(made.relative_uncertainty)} if made.relative_uncertainty else {})


def _usual_expiry(record: Record, known: Mapping[str, object]) -> tuple[datetime | None, str | None]:
    prepared_at, diluent = known["prepared_at"], known.get("diluent")
    with record.reading() as connection:
        names = Names(connection)
        row = row_by_id(connection, sheets.ANALYTES, names.row_id("analytes", str(known["analyte"])))
    if not isinstance(prepared_at, datetime):
        return None, None
    last = use_by(row["analyte"], str(diluent) if diluent else None, prepared_at)
    return last, RULES[row["analyte"].casefold()].why if last is not None else None
