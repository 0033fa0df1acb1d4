"""A book and its mapping give drafts of the record's rows: what a cell can't tell is asked, never guessed."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import datetime, timedelta, tzinfo

from electrolog.clock import parse_iso, utc_now
from electrolog.errors import InputError, shortened
from electrolog.record.books.coatings import Coatings
from electrolog.record.books.days import When, clock_time, date_order, order_in_heading, when
from electrolog.record.books.drafts import TIME_ASSUMED, Draft, Extract
from electrolog.record.books.grid import Book, Content, shown
from electrolog.record.books.labels import Labels
from electrolog.record.books.layout import Table, tables
from electrolog.record.books.mapping import BookMapping
from electrolog.record.books.measured import Measured
from electrolog.record.books.numbers import decimal_mark
from electrolog.record.books.said import Said
from electrolog.record.books.views import Found, View, views
from electrolog.record.books.vocabulary import Vocabulary, alike
from electrolog.record.columns import Value
from electrolog.units import MINUTES

_GAP = timedelta(minutes=30)  # between a run and a calibration whose time of day nobody wrote down


class Extraction:
    """One pass over a book. Each entry gives an electrode, its calibrations, and an exposure where a run is told."""

    def __init__(self, book: Book, mapping: BookMapping, vocabulary: Vocabulary, zone: tzinfo | None) -> None:
        self.book, self.mapping, self.zone = book, mapping, zone
        self.out = Extract()
        grids = [grid for grid in book.grids if grid.name not in mapping.skip]
        self.tables = [table for grid in grids for table in tables(grid, mapping.understand)]
        self._ask_of_columns(vocabulary)
        many = len({table.grid.name for table in self.tables}) > 1
        self.said = Said(mapping, vocabulary, self.out, many)
        self.labels = Labels(self.tables, mapping, vocabulary, self.out)
        self.measured = Measured(mapping, self.out, self._decimal_comma())
        self.coatings = Coatings(mapping, vocabulary, self.out)
        self.order = self._date_order()

    def run(self) -> Extract:
        for table in self.tables:
            for heading in table.headings:
                self.out.headings.setdefault(
                    " ".join(heading.text.split()), table.grid.place(table.header, heading.column)
                )
            for fact in table.facts:
                self.out.headings.setdefault(" ".join(fact.heading.split()), table.grid.place(*fact.spot))
            for view in views(table, self.mapping, self.out):
                self._take(view)
        self.out.drafts += self.coatings.drafts()
        if not self.tables:
            raise InputError(
                f"{self.book.name}: no table of calibrations or runs was found; accepted: headings such as"
                " Probe, Date, Sensitivity (nA/µM) or 0.5 µM, 1 µM",
                "say what the headings mean in the mapping file, under [headings]",
            )
        return self.out

    def _ask_of_columns(self, vocabulary: Vocabulary) -> None:
        """Whether columns are probes, where neither a heading nor the record says it."""
        doubted = [
            table
            for table in self.tables
            if table.matrix and not table.matrix.certain
            if any(alike(label) not in vocabulary.probes for _, label in table.matrix.probes)
        ]
        answer = self.mapping.answered("probe_columns")
        if answer == "nothing":
            self.tables = [table for table in self.tables if table not in doubted]
        elif doubted and answer != "probes":
            first = doubted[0]
            labels = ", ".join(label for _, label in (first.matrix.probes if first.matrix else ()))
            why = f"'{shortened(labels)}' at {first.grid.place(first.header, first.headings[-1].column)}"
            self.out.ask("probe_columns", "Is each of these columns one probe?", why, ("probes", "nothing"))

    def _take(self, view: View) -> None:
        stages = self.measured.stages(view)
        runs = view.first("duration")
        if not stages and view.table.matrix is not None:
            return  # this probe wasn't measured then
        if not stages and runs is None:
            said = " ".join(shown(one.value) for one in view.rows[0] if one.value is not None)
            self.out.say("left out", view.range, f"holds no measurement and no run: '{shortened(said)}'")
            return
        try:
            electrode = self.labels.of(view)
            marked = self._marked(view)
            exposure = self._exposure(view, electrode, runs) if runs is not None else None
        except InputError as why:
            self.out.say("refused", view.range, why.message)
            return
        shared = exposure is not None or len(stages) > 1
        entries = [exposure] if exposure else []
        refused = []
        for stage in stages:
            try:
                entries.append(self._calibration(view, electrode, stage, exposure, shared, marked))
            except InputError as why:
                refused.append(why.message)
        for said in refused:
            self.out.say("refused", view.range, said + ("; the rest of the row is taken" if entries else ""))
        if not entries:
            return
        for one in entries if refused else ():
            one.values["note"] = f"refused beside it: {shortened('; '.join(refused), 200)}; {one.values['note']}"
        self._coat(view, electrode, entries)
        self.out.drafts += [*self.labels.drafts(view, electrode, self.measured), *entries]

    def _coat(self, view: View, electrode: str, entries: list[Draft]) -> None:
        """Its coating: as a row, or in the notes of the entries that named it."""
        moments = [at for one in entries if isinstance(at := one.values.get("at", one.values.get("start")), datetime)]
        if not moments:
            return
        kept = self.coatings.see(view, electrode, moments, self._note(view, []), self._day_of_coating)
        for one in entries if kept else ():
            one.values["note"] = f"{kept}; {one.values['note']}"

    def _day_of_coating(self, found: Found) -> datetime:
        said = when(found.value, self.order)
        typed = said.time.isoformat() if said.time else self.mapping.times["coating"]
        return parse_iso(f"{said.day}T{typed}", self.zone, "coated on")

    def _calibration(
        self, view: View, electrode: str, heading_stage: str, run: Draft | None, shared: bool, marked: list[str]
    ) -> Draft:
        stage = heading_stage or self.said.stage(view)
        analyte, waveform = self.said.analyte(view), self.said.waveform(view)
        at, day, assumed = self._moment(view, stage, run, shared)
        numbers, points, notes = self.measured.calibration(view, heading_stage)
        texts, kept = self.said.texts(view)
        clock = "" if assumed else f"T{at.astimezone(self.zone):%H%M}"
        sign = "".join(analyte.split())
        if self.out.questions.get("analyte"):
            sign = "?"
        label = f"{electrode}_{day}{clock}_{stage}_{sign}"
        if view.first("waveform"):
            label += f"_{waveform}"
        notes = [*notes, *kept, *marked] + ([TIME_ASSUMED] if assumed else [])
        values: dict[str, Value] = {
            "calibration": label,
            "electrode": electrode,
            "at": at,
            "stage": stage,
            "analyte": analyte,
        }
        values |= {"waveform": waveform, **numbers, **texts, "note": self._note(view, notes)}
        return Draft("calibrations", values, view.range, points)

    def _exposure(self, view: View, electrode: str, runs: Found) -> Draft | None:
        minutes = self.measured.number(view, runs, MINUTES, "duration")
        if minutes is None:
            return None
        setting = self.said.setting(view)
        start, _, assumed = self._moment(view, "run", None, False)
        texts, kept = self.said.texts(view)
        notes = kept + ([TIME_ASSUMED] if assumed else [])
        subject, recording = view.first("subject"), view.first("recording")
        values: dict[str, Value] = {"electrode": electrode, "start": start, "duration_min": minutes, "setting": setting}
        values |= {"subject": shown(subject.value) if subject else self.said.subject(view)}
        values |= {"recording": shown(recording.value) if recording else None, "by": texts.get("by")}
        waveform = self.said.waveform(view)
        return Draft("exposures", {**values, "waveform": waveform or None, "note": self._note(view, notes)}, view.range)

    def _moment(self, view: View, stage: str, run: Draft | None, shared: bool) -> tuple[datetime, str, bool]:
        """When, which day, and whether the time of day is the mapping's. Raises InputError; also for the future.

        `shared`: a time of day in the row is the run's, or of one of several calibrations, and nobody knows of which.
        """
        found = view.first("day", stage)
        borrowed = found is None and stage == "run"
        found = self._day_of_run(view) if borrowed else found
        if found is None:
            raise InputError("date: missing; accepted: a date in the row, or beside a label above the table")
        said = self._when(view, found)
        own = not shared or bool(found.meaning and found.meaning.stage)
        time = said.time if own and not borrowed else None
        clock = view.first("time")
        if time is None and clock is not None and not shared:
            time = clock_time(clock.value)
        typed = time.isoformat() if time else self.mapping.times[stage]
        at = parse_iso(f"{said.day}T{typed}", self.zone, "date")
        if time is None and run is not None:
            at = _beside(at, stage, run)
        if at > utc_now():
            raise InputError(f"date: {said.day} at {view.place(found)} lies in the future; accepted: a day that was")
        return at, said.day.isoformat(), time is None

    def _day_of_run(self, view: View) -> Found | None:
        """Of a row that only dates its calibrations: their one day, or the one that a person says."""
        found = {stage: cells[0] for stage in ("pre", "post") if (cells := view.cells("day", stage))}
        days = {when(one.value, self.order).day for one in found.values()}
        answer = self.mapping.answered("run_day")
        if len(days) > 1 and not answer:
            places = " and ".join(view.place(one) for one in found.values())
            self.out.ask("run_day", "On the day of which calibration was the run?", f"{places} differ", tuple(found))
        return found.get(answer or "pre") or next(iter(found.values()), None)

    def _when(self, view: View, found: Found) -> When:
        said = when(found.value, self.order)
        if said.doubt:
            self.out.say("doubtful", view.place(found), said.doubt)
        return said

    def _note(self, view: View, notes: list[str]) -> str:
        unique = list(dict.fromkeys(note for note in notes if note))
        return "; ".join([*unique, f"from {self.book.name} {view.range} ({self.book.fingerprint[:12]})"])

    def _marked(self, view: View) -> list[str]:
        notes = []
        for place, marks in view.marks():
            if marks.comment:
                notes.append(f"comment on {place.rpartition('!')[2]}: {shortened(marks.comment, 300)}")
            if marks.colour:
                self.out.say("doubtful", place, f"is coloured {marks.colour}: taken as any other; kept in the note")
                notes.append(f"{place.rpartition('!')[2]} coloured {marks.colour}")
            if marks.struck:
                self._struck(place)
                notes.append(f"{place.rpartition('!')[2]} struck through in the book")
        return notes

    def _struck(self, place: str) -> None:
        answer = self.mapping.answered("struck")
        if answer == "leave":
            raise InputError(f"{place} is struck through, and the mapping leaves such rows out")
        if answer != "take":
            self.out.ask("struck", "Cells are struck through: take their rows all the same?", place, ("take", "leave"))
        self.out.say("doubtful", place, "is struck through: what was meant by it?")

    def _decimal_comma(self) -> bool:
        answer = self.mapping.answered("decimal_mark")
        found, why = decimal_mark(cell for grid in self.book.grids for row in grid.rows for cell in row)
        if not answer and not found:
            self.out.ask("decimal_mark", "Which is the decimal mark of numbers typed as text?", why, (".", ","))
        return (answer or found) == ","

    def _date_order(self) -> str:
        headings = (heading.text for table in self.tables for heading in table.headings)
        answer = self.mapping.answered("date_order") or next(filter(None, map(order_in_heading, headings)), "")
        found, why = date_order(_days(self.tables, self.mapping))
        if not answer and not found:
            self.out.ask("date_order", "In which order do dates stand?", why, ("dmy", "mdy", "ymd"))
        return answer or found


def _beside(at: datetime, stage: str, run: Draft) -> datetime:
    """A calibration without a time of day stays on its side of the run."""
    start, minutes = run.values["start"], run.values["duration_min"]
    assert isinstance(start, datetime)  # noqa: S101
    assert isinstance(minutes, float)  # noqa: S101
    if stage == "pre":
        return min(at, start - _GAP)
    return max(at, start + timedelta(minutes=minutes) + _GAP) if stage == "post" else at


def _days(found: list[Table], mapping: BookMapping) -> Iterator[Content]:
    for table in found:
        columns = [h.column for h in table.headings if (m := mapping.understand(h.text)) and m.field == "day"]
        yield from (table.grid.at(row, column) for row in table.rows for column in columns)
        yield from (fact.value for fact in table.facts if (m := mapping.understand(fact.heading)) and m.field == "day")
