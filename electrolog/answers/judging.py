"""The judging part of the one door: what probes will do, which to take, which to make, and why one got worse."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime, tzinfo
from typing import TYPE_CHECKING

from electrolog.record.store import Record

if TYPE_CHECKING:
    from electrolog.answers.asked import Run
    from electrolog.answers.assigning import Assignment
    from electrolog.answers.checking import Demands
    from electrolog.answers.comparing import Compared
    from electrolog.answers.diagnosing import Diagnosed
    from electrolog.answers.kinds import By
    from electrolog.answers.outlook import Outlook
    from electrolog.answers.plan import PlanRow
    from electrolog.answers.ranking import Ranking


def demands(needs_um: float | None, project: str, limits: Mapping[str, str] | None) -> Demands:
    from electrolog.answers.checking import Demands
    from electrolog.answers.limiting import typed_limits

    return Demands(needs_um, project, typed_limits(limits or {}))


@dataclass(frozen=True)
class Judging:
    """A record and the time zone in which times without an offset are read (None: the machine's)."""

    record: Record
    zone: tzinfo | None = None

    def ranking(
        self,
        run: Run,
        labels: Sequence[str] | None = None,
        *,
        needs_um: float | None = None,
        project: str = "",
        limits: Mapping[str, str] | None = None,
        moment: datetime | None = None,
    ) -> Ranking:
        """The named probes (None: every usable one) for a planned run, best first, with verdict and odds."""
        from electrolog.answers.ranking import ranking

        return ranking(self.record, labels, run, demands(needs_um, project, limits), moment)

    def assign(
        self, plan: Sequence[PlanRow], *, turnaround_min: float = 60.0, moment: datetime | None = None
    ) -> Assignment:
        """Which probe serves which planned run; `turnaround_min` lies between two runs of one probe."""
        from electrolog.answers.assigning import assigned

        return assigned(self.record, plan, turnaround_min=turnaround_min, moment=moment)

    def outlook(
        self,
        run: Run,
        labels: Sequence[str] | None = None,
        *,
        planned_runs: int | None = None,
        needs_um: float | None = None,
        project: str = "",
        limits: Mapping[str, str] | None = None,
        moment: datetime | None = None,
    ) -> Outlook:
        """How long the probes (None: every usable one) will last and, for all, how many to make for a month's runs."""
        from electrolog.answers.outlook import outlook

        asked = demands(needs_um, project, limits)
        return outlook(self.record, labels, run, asked, planned_runs, moment)

    def diagnose(
        self,
        label: str,
        analyte: str,
        waveform: str | None = None,
        *,
        first: bool = False,
        moment: datetime | None = None,
    ) -> Diagnosed:
        """Why the probe's last calibration differs from the one before it (`first`: from its first).

        waveform: None for the one it was last calibrated with.
        """
        from electrolog.answers.diagnosing import diagnosed

        return diagnosed(self.record, label, analyte, waveform, first=first, moment=moment)

    def compare(
        self, by: By, analyte: str, waveform: str | None = None, *, after_h: float = 10.0, more: int = 6
    ) -> Compared:
        """Whether kinds of probes differ, and where `more` probes would tell most.

        waveform: None for the most used one; waveforms themselves are compared over all.
        """
        from electrolog.answers.comparing import compared

        return compared(self.record, by, analyte, waveform, after_h=after_h, more=more)
