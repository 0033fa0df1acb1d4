"""The on-ramp part of the one door: a lab's own spreadsheets, the last entry once more, and what a paper says."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime, tzinfo
from pathlib import Path
from typing import TYPE_CHECKING

from electrolog.record.store import Record

if TYPE_CHECKING:
    from electrolog.answers.entering import Entered
    from electrolog.answers.methods import Described
    from electrolog.answers.recordings.runs import Runs
    from electrolog.answers.recordings.wanted import Enclosed
    from electrolog.record.books.adoption import Adoption
    from electrolog.record.exchange_files import Progress


@dataclass(frozen=True)
class Bringing:
    """A record and the time zone in which times without an offset are read (None: the machine's)."""

    record: Record
    zone: tzinfo | None = None

    def adopt(
        self,
        book: Path,
        *,
        mapping_file: Path | None = None,
        answers: Mapping[str, str] | None = None,
        commit: bool = False,
    ) -> Adoption:
        """What a spreadsheet holds for the record; written only on `commit`, all of it or nothing.

        The mapping is read from `mapping_file` (None: beside the book), and saved there with the answers.
        """
        from electrolog.record.books.adoption import adopt

        return adopt(
            self.record, book, mapping_file=mapping_file, answers=answers, commit=commit, zone=self.zone
        )  # fmt: skip

    def write_template(self, path: Path, concentrations_um: Sequence[float] = ()) -> None:
        """An empty book with the lab's words, which `adopt` reads without a question. Raises InputError."""
        from electrolog.record.books.template import USUAL_UM, write_template

        write_template(self.record, path, concentrations_um or USUAL_UM)

    def read_runs(
        self,
        folder: Path,
        *,
        setting: str | None = None,
        waveform: str | None = None,
        subject: str | None = None,
        probe: str | None = None,
        probes: Mapping[str, str] | None = None,
        commit: bool = False,
        confirmed: bool = False,
        progress: Progress | None = None,
    ) -> Runs:
        """The runs that a folder of recordings tells of; logged only on `commit`, all that is new or nothing.

        What is typed holds for recordings that don't say it themselves; `probes`: label by file. What is doubtful is
        logged only if `confirmed`.
        """
        from electrolog.answers.recordings.candidates import Given
        from electrolog.answers.recordings.runs import Asking, runs

        given = Given(setting, waveform, subject, probe, probes or {})
        return runs(self.record, folder, Asking(given, commit, confirmed, self.zone), progress or _unheard)

    def list_recordings(self, folder: Path, *, setting: str | None = None, progress: Progress | None = None) -> Path:
        """Writes `recordings.csv` into a folder, a row for each recording, to be filled in. Raises InputError."""
        from electrolog.answers.recordings.candidates import Given
        from electrolog.answers.recordings.runs import Asking, list_recordings

        return list_recordings(self.record, folder, Asking(Given(setting), zone=self.zone), progress or _unheard)

    def enclose(  # noqa: PLR0913 -- each is an option of the command
        self,
        file: Path,
        analyte: str,
        *,
        probe: str | None = None,
        waveform: str | None = None,
        convert: bool = False,
        series: str | None = None,
        unit: str = "uM",
        setting: str | None = None,
        needs_um: float | None = None,
        exposure: int | None = None,
        start: datetime | None = None,
        rate_hz: float | None = None,
        out: Path | None = None,
        in_place: bool = False,
        again: bool = False,
    ) -> Enclosed:
        """Puts a probe's papers into an NWB recording (a copy, unless `in_place`), or beside a .csv, .npy or .h5 one.

        Electrode, calibrations, factor in force and verdict as they stood when the run began; with `convert` the
        concentration (`unit`: uM or nM) with its 90 % band as well. Papers that are there already are a refusal,
        unless `again`.
        """
        from electrolog.answers.recordings.enclosing import enclosed
        from electrolog.answers.recordings.wanted import Wanted

        wanted = Wanted(
            file, analyte, probe, waveform, setting, exposure, start, rate_hz, needs_um, convert, series, unit, out,
            in_place, again,
        )  # fmt: skip
        return enclosed(self.record, wanted, self.zone)

    def again(
        self,
        labels: Sequence[str],
        points: Sequence[tuple[float, float]] = (),
        *,
        at: str | None = None,
        confirmed: bool = False,
    ) -> list[Entered]:
        """The last entry of the same person once more, for other probes; `points` (µM, nA) of a calibration."""
        from electrolog.answers.repeating import again

        return again(self.record, labels, points, at, self.zone, confirmed)

    def methods(self, labels: Sequence[str], analyte: str, waveform: str | None = None) -> Described:
        """The numbers of a methods section and its supplementary table; of every probe where none is named."""
        from electrolog.answers.methods import methods

        return methods(self.record, labels, analyte, waveform)

    def dictionary(self) -> list[dict[str, str]]:
        """What every column of every sheet means: unit, bounds, what it accepts."""
        from electrolog.answers.dictionary import entries

        return entries()


def _unheard(what: str, done: int) -> None:
    """Progress that nobody asked for."""
