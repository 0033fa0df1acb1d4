"""The numbers of an entry, each in its column's unit; a factor upside down is turned, a bound is no reading."""

from __future__ import annotations

import re
from dataclasses import replace

from electrolog import units
from electrolog.errors import InputError
from electrolog.record.books.drafts import Extract, Point
from electrolog.record.books.fields import FIELDS
from electrolog.record.books.grid import cell_name, shown
from electrolog.record.books.mapping import BookMapping
from electrolog.record.books.numbers import number
from electrolog.record.books.views import Found, View
from electrolog.record.columns import Value
from electrolog.units import Unit, parse_quantity, shown_number

ALONGSIDE = {
    "noise": "noise_na",
    "background": "background_na",
    "oxidation_peak": "oxidation_peak_v",
    "reduction_peak": "reduction_peak_v",
    "temperature": "temperature_c",
}
ASSUMED = {"temperature": "C"}  # nobody at a bench writes another (common practice)
NEEDED = ("sensitivity", "current", "concentration", "duration")
UPSIDE_DOWN = ("uM/nA", "nM/nA", "uM/pA", "nM/pA")


def units_of(field: str) -> tuple[str, ...]:
    unit = FIELDS[field][0]
    return (tuple(unit.factors) if unit else ()) + (UPSIDE_DOWN if field == "sensitivity" else ())


class Measured:
    def __init__(self, mapping: BookMapping, out: Extract, comma: bool) -> None:
        self.mapping, self.out, self.comma = mapping, out, comma

    def stages(self, view: View) -> list[str]:
        """The stages that headings name and cells fill, '' for what no heading says a stage of."""
        filled = [
            one
            for row in view.rows
            for one in (*row, *view.facts)
            if one.meaning and one.field in ("sensitivity", "current") and self._says_something(view, one)
        ]
        return list(dict.fromkeys(one.meaning.stage for one in filled if one.meaning))

    def _says_something(self, view: View, one: Found) -> bool:
        if one.value is None:
            return False
        try:
            said = number(one.value, units.PLAIN, "", self.comma)
        except InputError:
            return True  # to be refused where it is read
        if said.value is None:
            self.out.say("doubtful", view.place(one), said.doubt)
        return said.value is not None

    def calibration(self, view: View, stage: str) -> tuple[dict[str, Value], tuple[Point, ...], list[str]]:
        """The columns of a calibration that hold numbers, its points, and what of the cells goes into the note."""
        points = self._points(view, stage)
        values: dict[str, Value] = {}
        notes: list[str] = []
        for field, column in ALONGSIDE.items():
            found = view.first(field, stage)
            values[column] = self.optional(view, found, self._unit(field), field) if found else None
        factor, error = self._factor(view, stage)
        if factor is not None and points:
            notes.append(f"slope in the book {shown_number(factor, 5)} nA/µM")
        elif factor is not None:
            if factor <= 0:
                self._doubt_sign(view, stage, factor)
            values |= {"sensitivity_na_um": factor, "sensitivity_se_na_um": error}
        elif not points:
            raise InputError("sensitivity: no number; accepted: a factor, or currents at known concentrations")
        notes += self._dropped_words(view, stage)
        return {name: value for name, value in values.items() if value is not None}, points, notes

    def number(self, view: View, found: Found, unit: Unit, what: str) -> float | None:
        """A cell's number, its doubt said. Raises InputError that names the cell."""
        sign = self._sign(found, view)
        try:
            said = number(found.value, unit, what, self.comma, sign)
        except InputError as why:
            raise InputError(f"{view.place(found)}: {why.message}") from None
        if said.doubt:
            self.out.say("doubtful", view.place(found), said.doubt)
        return said.value

    def optional(self, view: View, found: Found, unit: Unit, what: str) -> float | None:
        """A number beside the measurement: one without a unit, or that can't be read, is said and left out."""
        if found.meaning and not found.meaning.unit and _is_bare(found) and what not in ASSUMED:
            self.out.say("doubtful", view.place(found), f"'{found.heading}' has no unit: {what} kept in the note")
            return None
        try:
            return self.number(view, found, unit, what)
        except InputError as why:
            self.out.say("doubtful", view.place(found), f"{why.message.partition(': ')[2]}; left unknown")
            return None

    def _unit(self, field: str) -> Unit:
        unit = FIELDS[field][0]
        assert unit is not None  # noqa: S101
        return unit

    def _sign(self, found: Found, view: View) -> str:
        meaning = found.meaning
        if meaning is None or meaning.unit:
            return meaning.unit if meaning else ""
        if meaning.field in ASSUMED:
            return ASSUMED[meaning.field]
        field = meaning.field.removesuffix("_se")
        if field not in NEEDED:
            return ""
        answer = self.mapping.answered(f"unit_{field}")
        if not answer and _is_bare(found):
            why = f"such as {view.place(found)}"
            self.out.ask(f"unit_{field}", f"In which unit is '{found.heading}'?", why, units_of(field))
        return "" if answer in UPSIDE_DOWN else answer

    def _factor(self, view: View, stage: str) -> tuple[float | None, float | None]:
        found = view.first("sensitivity", stage)
        if found is None:
            return None, None
        if self._is_inverted(found):
            return self._turned(view, found, stage)
        value = self.number(view, found, units.SENSITIVITY_NA_UM, "sensitivity")
        error = number(found.value, units.SENSITIVITY_NA_UM, "", self.comma, self._sign(found, view)).error
        beside = view.first("sensitivity_se", stage)
        if beside is not None and value is not None:
            error = self.optional(view, _in_unit_of(beside, found), units.SENSITIVITY_NA_UM, "standard error")
        return value, error

    def _doubt_sign(self, view: View, stage: str, factor: float) -> None:
        found = view.first("sensitivity", stage)
        said = f"a sensitivity of {shown_number(factor, 4)} nA/µM is not above zero: is its sign right?"
        self.out.say("doubtful", view.place(found) if found else view.range, said)

    def _is_inverted(self, found: Found) -> bool:
        answered = self.mapping.answered("unit_sensitivity") in UPSIDE_DOWN
        return bool(found.meaning and (found.meaning.inverted or (not found.meaning.unit and answered)))

    def _turned(self, view: View, found: Found, stage: str) -> tuple[float | None, float | None]:
        """µM per nA into nA per µM; the relative error stays what it is, to first order."""
        said = number(found.value, units.PLAIN, "sensitivity", self.comma)
        if said.doubt:
            self.out.say("doubtful", view.place(found), said.doubt)
        if said.value is None:
            return None, None
        if said.value == 0:
            raise InputError(f"{view.place(found)}: a factor of 0 µM/nA can't be turned; accepted: any other number")
        factor = parse_quantity(f"1{self._turned_unit(found)}", units.SENSITIVITY_NA_UM) / said.value
        beside = view.first("sensitivity_se", stage)
        error = said.error
        if beside is not None:
            error = number(beside.value, units.PLAIN, "standard error", self.comma).value
        return factor, None if error is None else abs(factor * error / said.value)

    def _turned_unit(self, found: Found) -> str:
        if found.meaning and found.meaning.unit:
            return found.meaning.unit
        molar, _, ampere = self.mapping.answered("unit_sensitivity").partition("/")
        return f"{ampere}/{molar}"

    def _points(self, view: View, stage: str) -> tuple[Point, ...]:
        return tuple(point for row in view.rows for point in self._row_points(view, row, stage))

    def _row_points(self, view: View, row: tuple[Found, ...], stage: str) -> list[Point]:
        concentration = next((one for one in row if one.field == "concentration" and one.value is not None), None)
        at = self.number(view, concentration, units.CONCENTRATION_UM, "concentration") if concentration else None
        points = []
        for one in row:
            if one.meaning is None or one.field != "current" or one.meaning.stage != stage or one.value is None:
                continue
            amount = at if one.meaning.concentration_um is None else one.meaning.concentration_um
            value = self.number(view, one, units.CURRENT_NA, "current")
            if value is not None and amount is None:
                raise InputError(
                    f"{view.place(one)}: a current at no concentration; accepted: one in its row or heading"
                )
            if value is not None and amount is not None:
                points.append((amount, value))
        return points

    def _dropped_words(self, view: View, stage: str) -> list[str]:
        """What a cell said beside its number: ~, <LOD, n/a."""
        cells = [one for row in view.rows for one in row if one.meaning and one.field in ("current", "sensitivity")]
        notes = []
        for one in cells:
            if isinstance(one.value, str) and one.meaning and one.meaning.stage == stage:
                said = number(one.value, self._unit(one.field), "", self.comma, "")
                if said.doubt:
                    notes.append(f"{cell_name(*one.spot)} was '{shown(one.value)}'")
        return notes


def _is_bare(found: Found) -> bool:
    """Whether the cell leaves its unit to the heading."""
    return re.fullmatch(r"[~≈±+\-\s\d.,e]+", shown(found.value)) is not None


def _in_unit_of(beside: Found, found: Found) -> Found:
    """A standard error without a unit of its own is in that of its sensitivity."""
    if beside.meaning and found.meaning and not beside.meaning.unit:
        return replace(beside, meaning=replace(beside.meaning, unit=found.meaning.unit or "nA/uM"))
    return beside
