"""The one door: everything the terminal can do, for Python users too.

    from electrolog import open_lab
    lab = open_lab("lab.db")
    lab.readings(["B1-01"])

Each method is one question or one entry; the answers are the dataclasses of electrolog/answers.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime, tzinfo
from pathlib import Path
from typing import TYPE_CHECKING

from electrolog.answers.bringing import Bringing
from electrolog.answers.judging import Judging, demands
from electrolog.answers.keeping import Keeping, rescue, restore
from electrolog.answers.looking import Looking
from electrolog.answers.measuring import Measuring
from electrolog.record import sheets
from electrolog.record.columns import Value
from electrolog.record.store import default_location, open_record

__all__ = ["Lab", "SetUp", "open_lab", "rescue", "restore", "set_up"]

if TYPE_CHECKING:
    from electrolog.answers.asked import Run
    from electrolog.answers.backtesting import Backtest
    from electrolog.answers.checking import Checked
    from electrolog.answers.converting import Converted
    from electrolog.answers.correcting import Corrected
    from electrolog.answers.entering import Entered
    from electrolog.answers.fitting import FittedCohort
    from electrolog.answers.forecasting import Forecast
    from electrolog.answers.limiting import LimitSet
    from electrolog.answers.shelf import Filter, Shelved
    from electrolog.record.exchange_files import Progress
    from electrolog.record.exchange_in import ImportReport
    from electrolog.record.exchange_out import ExportReport
    from electrolog.record.journal import Entry
    from electrolog.record.queries import Event
    from electrolog.record.readable import Row


@dataclass(frozen=True)
class Lab(Bringing, Measuring, Judging, Looking, Keeping):
    """A record and the time zone in which times without an offset are read (None: the machine's)."""

    # --- at the bench -------------------------------------------------------------------------------------

    def make_probes(
        self,
        labels: Sequence[str] = (),
        *,
        count: int | None = None,
        batch: Mapping[str, str | Value] | None = None,
        probe: Mapping[str, str | Value] | None = None,
    ) -> list[str]:
        """Adds probes by label, or `count` numbered ones of a batch; returns their labels."""
        from electrolog.answers.entering import make_probes

        return make_probes(self.record, labels, count, batch or {}, probe or {}, self.zone)

    def log(
        self, sheet: str, labels: Sequence[str], values: Mapping[str, str | Value], *, confirmed: bool = False
    ) -> list[Entered]:
        """Logs the same event for one probe or several. Raises DoubtfulEntry for a likely slip unless confirmed."""
        from electrolog.answers.entering import log

        return log(self.record, sheets.BY_NAME[sheet], values, labels, self.zone, confirmed)

    def log_plain(self, sheet: str, values: Mapping[str, str | Value]) -> Entered:
        """Adds a standard, a waveform, an analyte, a word: what is no event of a probe."""
        from electrolog.answers.entering import log_plain

        return log_plain(self.record, sheets.BY_NAME[sheet], values, self.zone)

    # --- asking back --------------------------------------------------------------------------------------

    def rows(self, sheet: str) -> list[Row]:
        """The live rows of a sheet, links by name."""
        from electrolog.record.readable import rows

        chosen = sheets.BY_NAME[sheet]
        with self.record.reading() as connection:
            return rows(connection, chosen, order=chosen.key[:1] if chosen.key[:1] != ("electrode",) else ())

    def labels(self, names: Sequence[str]) -> list[str]:
        """Labels as the record spells them, ranges taken apart. Raises UnknownName."""
        from electrolog.answers.labels import known_labels

        with self.record.reading() as connection:
            return known_labels(connection, names)

    def life(self, label: str) -> tuple[Row, list[Event]]:
        """A probe and its events in the order of time."""
        from electrolog.record import queries

        with self.record.reading() as connection:
            probe = queries.probes(connection, [label])[0]
            return probe, queries.events(connection, [probe["id"]]).get(label, [])

    def shelf(self, wanted: Filter, moment: datetime | None = None) -> list[Shelved]:
        from electrolog.answers.shelf import shelf

        return shelf(self.record, wanted, moment)

    def words(self, kind: str) -> list[str]:
        from electrolog.record.names import Names

        with self.record.reading() as connection:
            return Names(connection).words(kind)

    def moment(self, text: str) -> datetime:
        """A typed moment, in the lab's zone."""
        from electrolog.clock import parse_moment

        return parse_moment(text, self.zone)

    # --- judging ------------------------------------------------------------------------------------------

    def forecast(
        self,
        labels: Sequence[str],
        run: Run,
        quantiles: Sequence[float] = (0.05, 0.5, 0.95),
        moment: datetime | None = None,
    ) -> list[Forecast]:
        """What the named probes will still see after a run: quantiles of the true sensitivity."""
        from electrolog.answers.forecasting import forecasts

        return forecasts(self.record, labels, run, quantiles, moment)

    def check(
        self,
        labels: Sequence[str],
        run: Run,
        *,
        needs_um: float | None = None,
        project: str = "",
        limits: Mapping[str, str] | None = None,
        moment: datetime | None = None,
    ) -> list[Checked]:
        """The verdict on each probe for a run; `limits` override the lab's for this run, with their units."""
        from electrolog.answers.checking import check

        return check(self.record, labels, run, demands(needs_um, project, limits), moment)

    def cohort_fit(self, analyte: str, *, fresh: bool = False) -> FittedCohort:
        """How the lab's probes foul, as its record has taught; `fresh` fits again whatever is kept."""
        from electrolog.answers.fitting import fitted_cohort

        return fitted_cohort(self.record, analyte, fresh)

    def backtest(self, analyte: str, *, cuts: int = 4, progress: Progress | None = None) -> Backtest:
        """How good forecasts of the lab's own later calibrations would have been, without a look ahead."""
        from electrolog.answers.backtesting import backtested

        return backtested(self.record, analyte, cuts, progress)

    def convert(
        self,
        file: Path,
        label: str,
        analyte: str,
        waveform: str,
        *,
        exposure: int | None = None,
        start: datetime | None = None,
        rate_hz: float | None = None,
        background_na: tuple[float, float] | None = None,
    ) -> Converted:
        """A recording's currents as concentrations, with a 90 % band and all that they rest on.

        background_na: the charging current at the recording's start and end; used where it helps in this lab.
        """
        from electrolog.answers.background import Background
        from electrolog.answers.converting import Wanted, converted

        background = None if background_na is None else Background(*background_na)
        return converted(self.record, Wanted(file, label, analyte, waveform, exposure, start, rate_hz, background))

    def limits(self) -> list[LimitSet]:
        """Every limit there can be, with what the lab has set."""
        from electrolog.answers.limiting import limits

        return limits(self.record)

    def set_limit(
        self, rule: str, value: str, *, analyte: str | None = None, project: str | None = None, note: str | None = None
    ) -> LimitSet:
        from electrolog.answers.limiting import Scope, set_limit

        return set_limit(self.record, rule, value, Scope(analyte, project), note)

    def adopt_limits(self, rules: Sequence[str] = ()) -> list[LimitSet]:
        """Sets the named limits, or all that are offered, to their common-practice values."""
        from electrolog.answers.limiting import adopt

        return adopt(self.record, rules)

    def unset_limit(
        self, rule: str, *, analyte: str | None = None, project: str | None = None, reason: str = ""
    ) -> None:
        from electrolog.answers.limiting import Scope, unset

        unset(self.record, rule, Scope(analyte, project), reason)

    # --- correcting and trusting --------------------------------------------------------------------------

    def amend(
        self, one: str, name: str, values: Mapping[str, str], reason: str, *, confirmed: bool = False
    ) -> Corrected:
        """Corrects values. Raises DoubtfulEntry where somebody else lately amended the same, unless confirmed."""
        from electrolog.answers.correcting import amend_row

        return amend_row(self.record, one, name, values, reason, self.zone, confirmed)

    def strike(self, one: str, name: str, reason: str) -> Corrected:
        from electrolog.answers.correcting import strike_row

        return strike_row(self.record, one, name, reason)

    def journal(self, sheet: str | None = None, row_id: int | None = None) -> list[Entry]:
        from electrolog.record import journal

        with self.record.reading() as connection:
            return list(journal.entries(connection, sheet, row_id))

    def named(self, entries: Sequence[Entry]) -> list[str]:
        """What each entry of the journal did to what, rows by their labels: `amend point C0042/3`."""
        from electrolog.record.row_names import named

        with self.record.reading() as connection:
            return named(connection, entries)

    # --- in and out ---------------------------------------------------------------------------------------

    def import_folder(self, folder: Path, progress: Progress | None = None) -> ImportReport:
        from electrolog.record.exchange_in import import_folder

        return import_folder(self.record, folder, self.zone, progress)

    def export_folder(self, folder: Path) -> ExportReport:
        from electrolog.record.exchange_out import export_folder

        return export_folder(self.record, folder)

    def export_parquet(self, folder: Path, progress: Progress | None = None) -> ExportReport:
        """A .parquet file for each sheet of the exchange folder; types, units and UTC moments are kept."""
        from electrolog.record.exchange_parquet import export_parquet

        return export_parquet(self.record, folder, progress)


@dataclass(frozen=True)
class SetUp:
    where: str
    what: str
    revision: str
    copy: str | None


def set_up(where: str | None = None) -> SetUp:
    """Makes the record, or brings an older one up to date after a copy; one that is up to date is left alone."""
    from electrolog.record.migrate import set_up as bring_up

    record, what, revision, copy = bring_up(default_location() if where is None else where)
    return SetUp(record.name, what, revision, None if copy is None else str(copy))


def open_lab(
    where: str | None = None, *, zone: tzinfo | None = None, who: str | None = None, create: bool = False
) -> Lab:
    """The lab whose record is at `where` (a file or an SQLAlchemy URL; None: ELECTROLOG_DB or the platform's place).

    Raises RecordError when there is none, unless `create`.
    """
    return Lab(open_record(default_location() if where is None else where, who, create), zone)
