"""Which probe an entry belongs to: one spelling for each, and none decided where a tired hand may have written two."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator

from electrolog.errors import InputError, shortened
from electrolog.record.books.drafts import Draft, Extract
from electrolog.record.books.grid import shown
from electrolog.record.books.layout import Table
from electrolog.record.books.mapping import BookMapping
from electrolog.record.books.measured import Measured
from electrolog.record.books.views import View
from electrolog.record.books.vocabulary import Vocabulary, alike
from electrolog.record.columns import Value
from electrolog.units import LENGTH_UM


class Labels:
    def __init__(self, found: list[Table], mapping: BookMapping, vocabulary: Vocabulary, out: Extract) -> None:
        self.mapping, self.out, self.vocabulary = mapping, out, vocabulary
        self.above: dict[int, str] = {}
        self.main = dict(_main_spellings(found, mapping)) | dict(vocabulary.probes)
        self.said: dict[str, dict[str, Value]] = {}

    def of(self, view: View) -> str:
        """The label as the record is to have it. Raises InputError where none stands, or its spelling is in doubt."""
        found = view.first("electrode")
        if found is not None:
            self.above[id(view.table)] = label = self._spelled(_label(shown(found.value)), view.place(found))
            return label
        has_column = any(one.field == "electrode" for one in view.rows[0])
        if has_column and self._is_as_above(view):
            return self.above[id(view.table)]
        if not has_column and self._sheets_are_probes(view):
            return self._spelled(view.table.grid.name, view.range)
        raise InputError("probe: missing; accepted: its label in the row, or beside a label above the table")

    def _is_as_above(self, view: View) -> bool:
        if id(view.table) not in self.above:
            return False
        answer = self.mapping.answered("blank_probe")
        if answer == "":
            self.out.ask("blank_probe", "Does a blank cell mean the probe above?", view.range, ("above", "refuse"))
        return answer in ("", "above")

    def _sheets_are_probes(self, view: View) -> bool:
        answer = self.mapping.answered("sheet_name")
        if answer == "":
            why = f"no cell names the probe of {view.range}"
            accepted = ("probe", "subject", "nothing")
            self.out.ask("sheet_name", "What do the sheets' names stand for?", why, accepted)
        return answer in ("", "probe")

    def _spelled(self, label: str, place: str) -> str:
        told = self.mapping.spellings.get(label)
        if told is not None:
            return told
        main = self.main.get(alike(label), label)
        if main == label:
            return label
        self.out.ask(f"same:{label}", f"Is '{label}' the probe '{main}'?", place, (main, label))
        raise InputError(
            f"probe: '{shortened(label)}' at {place} may be '{shortened(main)}' in another spelling;"
            f' accepted: under [spellings] of the mapping "{label}" = "{main}", or "{label}" = "{label}" for a probe'
            " of its own"
        )

    def drafts(self, view: View, electrode: str, measured: Measured) -> list[Draft]:
        """The probe, with what the entry says of it that no earlier one did; its batch where one is named."""
        values = self.said.setdefault(electrode, {"electrode": electrode})
        batch = view.first("batch")
        self._learn(values, "batch", shown(batch.value) if batch else None, view)
        for field, column in (("length", "exposed_length_um"), ("diameter", "diameter_um")):
            found = view.first(field)
            value = measured.optional(view, found, LENGTH_UM, field) if found else None
            self._learn(values, column, value, view)
        made = [Draft("electrodes", values, view.range)]
        return [Draft("batches", {"batch": values["batch"]}, view.range), *made] if values.get("batch") else made

    def _learn(self, values: dict[str, Value], column: str, value: Value, view: View) -> None:
        if value is None:
            return
        before = values.setdefault(column, value)
        if before != value:
            said = f"{column} of {values['electrode']} is {value} here and {before} above: the first is taken"
            self.out.say("doubtful", view.range, said)


def _label(text: str) -> str:
    return " ".join(text.split())


def _main_spellings(found: list[Table], mapping: BookMapping) -> Iterator[tuple[str, str]]:
    """Folded -> the spelling that the book uses most, the first of equals."""
    counts: dict[str, Counter[str]] = {}
    for table in found:
        for text in _probe_cells(table, mapping):
            if text not in mapping.spellings:
                counts.setdefault(alike(text), Counter())[text] += 1
    for folded, spellings in counts.items():
        yield folded, spellings.most_common(1)[0][0]


def _probe_cells(table: Table, mapping: BookMapping) -> Iterator[str]:
    columns = [h.column for h in table.headings if (m := mapping.understand(h.text)) and m.field == "electrode"]
    for row in table.rows:
        for column in columns:
            text = _label(table.grid.own_text(row, column))
            if text:
                yield text
    for fact in table.facts:
        if (m := mapping.understand(fact.heading)) and m.field == "electrode":
            yield _label(shown(fact.value))
