"""The looking part of the one door: what figures, charts and the report are drawn from."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime, tzinfo
from typing import TYPE_CHECKING

from electrolog.record.store import Record

if TYPE_CHECKING:
    from electrolog.answers.course import Ahead, Course
    from electrolog.answers.fan import Fan
    from electrolog.answers.kinds import By
    from electrolog.answers.plan import PlanRow
    from electrolog.answers.report import LabSheet, Origin, Planned, ProbeSheet, Progress
    from electrolog.answers.report_week import WeekSheet
    from electrolog.fouling.typical import TypicalLoss
    from electrolog.judge.compare import Groups


@dataclass(frozen=True)
class Looking:
    """A record and the time zone in which times without an offset are read (None: the machine's)."""

    record: Record
    zone: tzinfo | None = None

    def courses(
        self,
        labels: Sequence[str],
        analyte: str | None = None,
        waveform: str | None = None,
        *,
        ahead: Ahead | None = None,
        moment: datetime | None = None,
    ) -> list[Course]:
        """Each named probe's sensitivity: what was read, what is believed, and what is ahead by the kept fit."""
        from electrolog.answers.course import courses

        return courses(self.record, labels, analyte, waveform, ahead, moment)

    def typical_losses(self, analyte: str) -> list[TypicalLoss]:
        """What is left of a typical probe of each kind after hours in vivo, by the cohort's fit."""
        from electrolog.answers.fan import typical_losses

        return typical_losses(self.record, analyte)

    def fan(self, analyte: str) -> Fan:
        """Every probe's loss, aligned at its reference, with the typical loss of each kind."""
        from electrolog.answers.fan import fan

        return fan(self.record, analyte)

    def groups(self, by: By, analyte: str, waveform: str | None = None) -> Groups:
        """Level, loss, yield and life of every probe, by what distinguishes them."""
        from electrolog.answers.comparing import groups_of

        return groups_of(self.record, by, analyte, waveform)

    def origin(self, moment: datetime | None = None) -> Origin:
        """Who asks, when, which state of the record it is, and by which methods figures are made."""
        from electrolog.answers.report import origin

        return origin(self.record, moment)

    def probe_sheets(
        self, labels: Sequence[str], planned: Planned | None = None, moment: datetime | None = None
    ) -> list[ProbeSheet]:
        """All that a report tells of the named probes; with a planned run, the verdict for it."""
        from electrolog.answers.report import probe_sheets

        return probe_sheets(self.record, labels, planned, moment)

    def lab_sheet(
        self,
        planned: Planned | None = None,
        moment: datetime | None = None,
        *,
        backtest: bool = False,
        progress: Progress | None = None,
    ) -> LabSheet:
        """All that a report tells of the lab; with a planned run, every verdict for it and how many probes to make.

        backtest: forecast the lab's own past anew, which takes minutes, in place of telling the kept result.
        """
        from electrolog.answers.report import lab_sheet

        return lab_sheet(self.record, planned, moment, backtest=backtest, progress=progress)

    def week_sheet(self, plan: Sequence[PlanRow], moment: datetime | None = None) -> tuple[WeekSheet, list[ProbeSheet]]:
        """Which probe serves which planned run, and all that a report tells of those probes."""
        from electrolog.answers.report_week import sheets_of_week, week_sheet
        from electrolog.clock import utc_now

        moment = moment or utc_now()
        week = week_sheet(self.record, plan, moment)
        return week, sheets_of_week(self.record, week, plan, moment)
