"""The points of an exchange folder, gathered by calibration: a calibration and its points are one unit."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from itertools import chain, groupby

from electrolog.errors import shortened
from electrolog.record import sheets
from electrolog.record.exchange_faults import Faults
from electrolog.record.exchange_files import Rows
from electrolog.record.exchange_known import Known, Point, StoredPoints
from electrolog.record.names import Names

POINTS_FILE = f"{sheets.POINTS.name}.csv"


class FilePoints:
    """Points by the folded label of their calibration, in the order of the file."""

    def __init__(self, rows: Rows | None) -> None:
        self._rows = rows or Rows(sheets.POINTS, cells=[[] for _ in sheets.POINTS.columns])
        self._labels, self._concentrations, self._currents = self._rows.cells
        self._members: dict[str, list[range]] = defaultdict(list)  # where its points stand, mostly in one piece
        start = 0
        for label, run in groupby(self._labels):
            stop = start + sum(1 for _ in run)
            if label is not None:
                self._members[label.casefold()].append(range(start, stop))
            start = stop
        self._doubtful = {self._labels[index].casefold() for index in self._rows.faulty if self._labels[index]}

    def of(self, label: str) -> list[Point]:
        """The points of one calibration, by its folded label."""
        found: list[Point] = []
        for run in self._members.get(label, ()):
            stretch = slice(run.start, run.stop)
            found += zip(self._concentrations[stretch], self._currents[stretch], strict=True)
        return found

    def agree(self, label: str, stored: Sequence[Sequence[Point]]) -> bool:
        """Whether the file says nothing else about its points than one of these; a fault told already says nothing."""
        found = self.of(label)
        return not found or label in self._doubtful or any(_same(found, points) for points in stored)

    def refuse_other(self, label: str, row_id: int, stored: StoredPoints, faults: Faults) -> bool:
        """A fault when the record has other points for this calibration."""
        if self.agree(label, (stored.live[row_id], stored.every[row_id])):
            return False
        first = self._members[label][0].start
        held = f"{len(stored.live[row_id])} other points" if stored.live[row_id] else "no points"
        faults.add(
            POINTS_FILE,
            self._rows.lines[first],
            f"calibration: found {len(self.of(label))} points for '{shortened(self._labels[first])}', the record has"
            f" {held}; accepted: the same points, or none; correct the record with `electrolog amend` or `strike`",
        )
        return True

    def refuse_strays(self, taken: set[str], known: Known, stored: StoredPoints, names: Names, faults: Faults) -> int:
        """Points whose calibration has no row in the folder; returns how many the record has already."""
        there = 0
        for label in self._members.keys() - taken:
            live = known.live.get(label)
            if live is None:
                self._refuse_unknown(label, names, faults)
            elif not self.refuse_other(label, live[0], stored, faults):
                there += sum(map(len, self._members[label]))
        return there

    def _refuse_unknown(self, label: str, names: Names, faults: Faults) -> None:
        calibrations = [spelling for spelling, _ in names.everything("calibrations").values()]
        said = faults.unknown("calibration", self._labels[self._members[label][0].start], calibrations)
        for index in chain.from_iterable(self._members[label]):
            hint = "; accepted: one in calibrations.csv or in the record"
            faults.add(POINTS_FILE, self._rows.lines[index], f"calibration: {said}{hint}")


def _same(found: list[Point], stored: Sequence[Point]) -> bool:
    return found == stored or (len(found) == len(stored) and sorted(found) == sorted(stored))
