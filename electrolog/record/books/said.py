"""The words of an entry: analyte, waveform, stage, medium and who; as the record has them, or asked, or in the note."""

from __future__ import annotations

import re
from collections.abc import Mapping

from electrolog.errors import InputError, shortened, unknown
from electrolog.record.books.drafts import Extract
from electrolog.record.books.grid import shown
from electrolog.record.books.mapping import BookMapping
from electrolog.record.books.numbers import UNKNOWN
from electrolog.record.books.views import Found, View
from electrolog.record.books.vocabulary import Vocabulary
from electrolog.record.columns import Value

_STAGES = (
    ("interim", r"interim|mid\w*|during|inter"),
    ("pre", r"pre\b.*|pre-?cal\w*|before.*|prior.*"),
    ("post", r"post\b.*|post-?cal\w*|after.*"),
)
_NAMED = re.compile(r"\[\s*([^\[\]]+?)\s*\]|^\s*([A-Za-z0-9-]{2,6})\s+\d|^\s*(\w[\w ,-]*?)\s*[\[(,]?\s*[unmµμ]M\b")


class Said:
    def __init__(self, mapping: BookMapping, vocabulary: Vocabulary, out: Extract, many_sheets: bool) -> None:
        self.many_sheets = many_sheets
        self.mapping, self.vocabulary, self.out = mapping, vocabulary, out

    def analyte(self, view: View) -> str:
        found = view.first("analyte")
        if found is not None:
            return self._word("analyte", shown(found.value), view.place(found), self.vocabulary.analytes)
        answer = self.mapping.answered("analyte") or self._in_headings(view)
        if not answer:
            names = dict.fromkeys(self.vocabulary.analytes.values())
            self.out.ask("analyte", "What was measured?", f"no cell of {view.range} says it", names)
            return ""
        return self._word("analyte", answer, "the answer", self.vocabulary.analytes)

    def _in_headings(self, view: View) -> str:
        """`[DA] (µM)` or `DA 1 µM` names what was measured."""
        for heading in view.table.headings:
            for said in _NAMED.findall(heading.text):
                for name in said:
                    if name.casefold() in self.vocabulary.analytes:
                        return str(name)
        return ""

    def waveform(self, view: View) -> str:
        found = view.first("waveform")
        if found is not None:
            return self._word("waveform", shown(found.value), view.place(found), self.vocabulary.waveforms)
        answer = self.mapping.answered("waveform")
        if not answer:
            names = self.vocabulary.waveforms.values()
            self.out.ask("waveform", "With which waveform?", f"no cell of {view.range} says it", names)
            return ""
        return self._word("waveform", answer, "the answer", self.vocabulary.waveforms)

    def stage(self, view: View) -> str:
        found = view.first("stage")
        if found is not None:
            text = shown(found.value).casefold()
            stage = next((stage for stage, pattern in _STAGES if re.fullmatch(pattern, text)), None)
            if stage is None:
                raise unknown("stage", shown(found.value), ("pre", "interim", "post"))
            return stage
        answer = self.mapping.answered("stage")
        if not answer:
            accepted = ("pre", "interim", "post")
            self.out.ask("stage", "Before or after the run?", f"no cell of {view.range} says it", accepted)
            return "pre"
        return answer

    def setting(self, view: View) -> str:
        found = view.first("setting")
        if found is not None:
            return self._word("setting", shown(found.value), view.place(found), self.vocabulary.settings)
        answer = self.mapping.answered("setting")
        if not answer:
            names = self.vocabulary.settings.values()
            self.out.ask("setting", "Where was the probe in its runs?", f"no cell of {view.range} says it", names)
            return ""
        return self._word("setting", answer, "the answer", self.vocabulary.settings)

    def subject(self, view: View) -> str | None:
        """The sheet's name, where that is what sheets are named by."""
        if self.many_sheets and not self.mapping.answered("sheet_name"):
            why = f"no cell says whose run that of {view.range} was"
            self.out.ask("sheet_name", "What do the sheets' names stand for?", why, ("subject", "nothing"))
        return view.table.grid.name if self.mapping.answered("sheet_name") == "subject" else None

    def texts(self, view: View) -> tuple[dict[str, Value], list[str]]:
        """The columns that hold words, and what goes into the note: nothing that a cell says is lost."""
        texts: dict[str, Value] = {}
        kept = [shown(one.value) for one in view.cells("note")]
        for field in ("rig", "by"):
            found = view.first(field)
            texts[field] = shown(found.value) if found else self.mapping.answered(field) or None
        medium = view.first("medium")
        if medium is not None:
            texts["medium"], said = self._medium(view, medium)
            kept += [said] if said else []
        standard = view.first("standard")
        if standard is not None:
            texts["standard"], said = self._standard(view, standard)
            kept += [said] if said else []
        kept += [f"{one.heading or 'beside'}: {shown(one.value)}" for one in view.cells("other")]
        kept += [f"{one.heading}: {shown(one.value)}" for one in view.cells("derived")]
        for field in ("noise", "background", "length", "diameter"):
            for one in view.cells(field):
                if one.meaning and not one.meaning.unit:
                    kept.append(f"{one.heading}: {shown(one.value)}")
        return texts, kept

    def _medium(self, view: View, found: Found) -> tuple[str | None, str]:
        text = shown(found.value)
        told = self.mapping.words.get(text, text)
        word = self.vocabulary.media.get(told.casefold())
        if word is None:
            said = f"'{text}' is no word of the list 'medium': kept in the note; under [words] it can be made one"
            self.out.say("doubtful", view.place(found), said)
        return word, "" if word == text else f"medium: {text}"

    def _standard(self, view: View, found: Found) -> tuple[str | None, str]:
        """A standard is linked where the record has it; what it was made of, no cell of a calibration tells."""
        text = shown(found.value)
        if text.casefold() in UNKNOWN:
            return None, ""
        label = self.vocabulary.standards.get(self.mapping.words.get(text, text).casefold())
        if label is None:
            why = f"'{shortened(text, 60)}' is no standard of the record: kept in the note"
            how = "log it with `electrolog standard` and adopt the book again: the link is then filled in"
            self.out.say("doubtful", view.place(found), f"{why}; {how}")
        return label, "" if label == text else f"{found.heading}: {text}"

    def _word(self, kind: str, text: str, place: str, known: Mapping[str, str]) -> str:
        told = self.mapping.words.get(text, text)
        word = known.get(told.casefold())
        if word is None:
            said = unknown(kind, told, known.values())
            raise InputError(f"{place}: {shortened(said.message, 200)}; or name it under [words] of the mapping")
        return word
