"""What becomes of each run: whether the record has it already, and what speaks against it."""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import timedelta

from electrolog.answers import doubts
from electrolog.answers import life as lives
from electrolog.answers.recordings.candidates import Candidate, recording_of
from electrolog.answers.signal_files import fingerprint
from electrolog.clock import shown_moment, utc_now
from electrolog.record import journal, queries, sheets
from electrolog.record.queries import Event
from electrolog.record.readable import Row
from electrolog.record.store import Connection
from electrolog.units import shown_duration

_READ_FROM = re.compile(r"read from (.+), SHA-256 ([0-9a-f]{64})")
CLOCKS_DIFFER = timedelta(minutes=5)
SAME_S = 1.0
WORTH_SAYING_MIN = 5.0


def read_from(file: str, sha256: str) -> str:
    """The reason of a journal entry, which also tells whether a file has been read before."""
    return f"read from {file}, SHA-256 {sha256}"


@dataclass(frozen=True)
class Standing:
    """What the record knows: probes and their lives by label, and the exposure (its number) each file has given."""

    probes: Mapping[str, Row]
    life: Mapping[str, Sequence[Event]]
    given: Mapping[tuple[str, str], int]  # (recording, SHA-256) -> exposure

    @classmethod
    def of(cls, connection: Connection) -> Standing:
        probes = {probe["electrode"]: probe for probe in queries.probes(connection)}
        reasons = [(entry.reason, entry.row_id) for entry in journal.entries(connection, sheets.EXPOSURES.name)]
        found = [(match, row_id) for reason, row_id in reasons if (match := _READ_FROM.fullmatch(reason))]
        given = {(recording_of(match[1]), match[2]): row_id for match, row_id in found}
        return cls(probes, queries.events(connection), given)

    def settle(self, found: Sequence[Candidate]) -> None:
        """Says of each what there is to say; two that can't both be true are both refused."""
        for one in found:
            if not one.refusals:
                self._look(one)
            elif not one.probe and one.path.is_file() and (number := self._read_before(one)):
                one.refusals, one.there = [], f"exposure {number} was read from this very file"
        _compare([one for one in found if one.start is not None])

    def _look(self, one: Candidate) -> None:
        assert one.start is not None  # noqa: S101 -- such are refused before
        assert one.duration_min is not None  # noqa: S101
        if not one.duration_min > 0:
            one.refusals.append("has no length: its last sample isn't later than its first")
        elif one.end > utc_now() + CLOCKS_DIFFER:
            one.refusals.append(f"ends at {shown_moment(one.end)}, in the future: is its clock right?")
        elif not self._is_there(one):
            values = {"electrode": one.probe, "start": one.start, "duration_min": one.duration_min}
            retired = lives.of(self.life.get(one.probe, ()), sheets.RETIREMENTS)
            one.doubts += doubts.of_event(sheets.EXPOSURES, values, retired, self.probes[one.probe]["made_on"])

    def _is_there(self, one: Candidate) -> bool:
        for other in lives.of(self.life.get(one.probe, ()), sheets.EXPOSURES):
            assert one.start is not None  # noqa: S101
            if other.at < one.end and lives.end_of(other) > one.start:
                self._meets(one, other)
        if not (one.there or one.refusals) and (number := self._read_before(one)):
            one.there = f"exposure {number} was read from this very file, and has been corrected or struck since"
        return bool(one.there or one.refusals)

    def _meets(self, one: Candidate, other: Event) -> None:
        minutes = other.row["duration_min"]
        if other.row["recording"] == one.recording:
            one.there = f"{other.name}"
            if abs(minutes - (one.duration_min or 0.0)) > WORTH_SAYING_MIN:
                one.there += f", where it lasts {shown_duration(minutes)}: left as it is"
        elif other.at != one.start:
            one.refusals.append(
                f"overlaps with {other.name}, {other.row['setting']} from {shown_moment(other.at)} for"
                f" {shown_duration(minutes)}; if that is this run, say so:"
                f" electrolog amend exposure {other.row['id']} recording={one.recording}"
            )

    def _read_before(self, one: Candidate) -> int | None:
        """By its bytes, but only where its name is known: hashing a folder of large files takes minutes."""
        names = {name for name, _ in self.given}
        if one.recording not in names:
            return None
        return self.given.get((one.recording, one.sha256 or fingerprint(one.path)))


def _compare(found: Sequence[Candidate]) -> None:
    """Within the folder: the same run twice is taken once; two at a time of one probe are refused, both."""
    by_probe: dict[str, list[Candidate]] = defaultdict(list)
    for one in found:
        if not one.refusals:
            by_probe[one.probe].append(one)
    for group in by_probe.values():
        group.sort(key=lambda one: (one.start, len(one.file)))
        for place, one in enumerate(group):
            for other in group[:place]:
                _compare_two(other, one)


def _compare_two(first: Candidate, second: Candidate) -> None:
    assert first.start is not None  # noqa: S101
    assert second.start is not None  # noqa: S101
    apart_s = abs((second.start - first.start).total_seconds()), abs((second.end - first.end).total_seconds())
    if max(apart_s) < SAME_S:
        second.repeats = first.file
    elif second.start < first.end and not (first.repeats or second.repeats):
        for one, other in ((first, second), (second, first)):
            if not one.there:  # what is on record stays there, whatever else comes
                one.refusals.append(f"overlaps with {other.file}: a probe can't be in two places at once")
