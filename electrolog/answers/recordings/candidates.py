"""Every recording of a folder as a run that may be logged: what its file, the list and whoever asks say of it."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from datetime import datetime, timedelta, tzinfo
from pathlib import Path

from electrolog.answers.recordings import nwb
from electrolog.answers.recordings.listed import LIST, Listed, read_list
from electrolog.answers.recordings.naming import Labels, Named
from electrolog.answers.recordings.plain_labels import labels_in
from electrolog.answers.recordings.span import ENDINGS, span_s
from electrolog.answers.recordings.told import Told
from electrolog.clock import shown_moment
from electrolog.errors import InputError

ENCLOSED = ".enclosed"  # the end of a name's stem, or of a folder's, that we have put papers in
Tell = Callable[[str, int], None]


@dataclass(frozen=True)
class Given:
    """What whoever asks says of recordings that don't say it themselves; `probes` by file, `probe` of all the rest."""

    setting: str | None = None
    waveform: str | None = None
    subject: str | None = None
    probe: str | None = None
    probes: Mapping[str, str] = field(default_factory=dict)


@dataclass
class Candidate:
    """One run of one probe. `said`: what was assumed; `doubts` want a yes; with a refusal it isn't logged.

    `there`: which row of the record it is; `repeats`: the other file of the folder that tells of the same run.
    """

    file: str
    path: Path
    probe: str = ""
    probe_from: str = ""
    start: datetime | None = None
    duration_min: float | None = None
    sha256: str | None = None
    texts: dict[str, str | None] = field(default_factory=dict)
    said: list[str] = field(default_factory=list)
    doubts: list[str] = field(default_factory=list)
    refusals: list[str] = field(default_factory=list)
    there: str = ""
    repeats: str = ""

    @property
    def recording(self) -> str:
        """Its name in the record; a copy with papers in it is the same recording."""
        return recording_of(self.file)

    @property
    def end(self) -> datetime:
        assert self.start is not None  # noqa: S101 -- asked of those that have both alone
        return self.start + timedelta(minutes=self.duration_min or 0.0)


@dataclass(frozen=True)
class Folder:
    """A folder of recordings; `zone` is that of times without an offset."""

    path: Path
    zone: tzinfo | None
    given: Given
    labels: Labels

    def candidates(self, tell: Tell) -> Iterator[Candidate]:
        """In the order of their names. Raises InputError for a folder or a list that can't be read."""
        rows: dict[str, list[Listed | None]] = defaultdict(list)
        for listed in read_list(self.path):
            rows[listed.file].append(listed)
        names = sorted({*rows, *recordings_in(self.path)})
        for done, name in enumerate(names):
            tell("recordings read", done)
            for row in rows.get(name) or [None]:
                yield from self._of_file(name, row)

    def _of_file(self, name: str, listed: Listed | None) -> Iterator[Candidate]:
        path = self.path / name
        try:
            if not path.resolve().is_relative_to(self.path.resolve()):
                raise InputError("lies outside this folder; accepted: a file in it")
            told = self._told(path, listed)
            probes = self.probes(name, listed, told)
        except InputError as why:
            yield Candidate(name, path, refusals=[_without_name(why, path)])
            return
        for probe in probes:
            yield self._candidate(Candidate(name, path, probe.label, probe.where), listed, told)

    def _told(self, path: Path, row: Listed | None) -> Told:
        listed = Told() if row is None else row.told(self.zone)
        if path.suffix.casefold() == ".nwb":
            return nwb.told_by(path, self.zone, listed)
        if not path.is_file():
            raise InputError("there is no such file")
        if listed.start is None:
            raise InputError(f"when did it begin? accepted: a start in {LIST}, since such a file can't tell")
        first_s, last_s = 0.0, listed.duration_s
        if last_s is None:
            first_s, last_s = span_s(path, None if row is None else row.rate_hz())
        return replace(listed, duration_s=last_s - first_s, probes=labels_in(path.with_name(f"{path.stem}{ENCLOSED}")))

    def probes(self, name: str, listed: Listed | None, told: Told) -> list[Named]:
        """Which probes recorded a file. Raises UnknownName, or InputError where it isn't told, or told twice."""
        own = [Named(self.labels.required(label), "its own entry") for label in told.probes]
        typed = self._typed(name, listed)
        if typed is not None:
            if own and typed.label not in [one.label for one in own]:
                said = ", ".join(one.label for one in own)
                raise InputError(
                    f"{typed.where} says {typed.label}, the papers in the file are of {said}: which is it?"
                )
            return [typed]
        devices = list(dict.fromkeys(filter(None, map(self.labels.spelled, told.devices))))
        if own or len(devices) == 1:
            return own or [Named(devices[0], "a device in the file")]
        return [self.labels.by_name(self._parts(name))]

    def _typed(self, name: str, listed: Listed | None) -> Named | None:
        text = None if listed is None else listed.text("probe")
        if text is not None:
            return Named(self.labels.required(text), LIST)
        text = self.given.probes.get(name)
        if text is not None:
            return Named(self.labels.required(text), "--probe")
        if self.given.probe is None:
            return None
        label = self.labels.required(self.given.probe)
        others = [found for found in self.labels.inside(self._parts(name)[0]) if found != label]
        if others:
            raise InputError(f"its name says {others[0]}, --probe says {label}: which is it?")
        return Named(label, "--probe")

    def _parts(self, name: str) -> Sequence[str]:
        """The file's name and its folders', from the inside out."""
        inside = Path(name)
        folders = [part.name for part in inside.parents if part.name]
        return [inside.stem.removesuffix(ENCLOSED), *folders, self.path.resolve().name]

    def _candidate(self, one: Candidate, listed: Listed | None, told: Told) -> Candidate:
        assert told.start is not None  # noqa: S101 -- refused before
        one.start, one.duration_min, one.sha256 = told.start, (told.duration_s or 0.0) / 60, told.sha256
        names = ("subject", "setting", "waveform", "medium", "by", "note")
        one.texts = {name: None if listed is None else listed.text(name) for name in names}
        one.texts["subject"] = told.subject or self.given.subject
        one.texts["setting"] = one.texts["setting"] or self.given.setting
        one.texts["waveform"] = one.texts["waveform"] or self.given.waveform
        if told.zone_assumed:
            one.said.append(f"its start has no offset: taken for {self._zone()}, {shown_moment(told.start, self.zone)}")
        if not one.texts["subject"]:
            one.said.append("names no subject: it stays unknown")
        one.said += told.said
        return one

    def _zone(self) -> str:
        return "the time of this machine's zone" if self.zone is None else f"the time of {self.zone}"


def recordings_in(folder: Path) -> list[str]:
    """Every NWB file, as the list would name it. Raises InputError for what is no folder."""
    if not folder.is_dir():
        said = "is a file" if folder.exists() else "is not there"
        raise InputError(f"{folder} {said}; accepted: a folder of recordings")
    return [path.as_posix() for path in _files_in(folder, (".nwb",))]


def plain_files(folder: Path) -> list[str]:
    """Files that may be recordings, though only the list can say so."""
    found = [path for path in _files_in(folder, ENDINGS) if path.name != LIST]
    return [path.as_posix() for path in found if not any(ENCLOSED in part for part in path.parts)]


def _files_in(folder: Path, endings: Sequence[str]) -> list[Path]:
    """As the folder names them, in order; neither hidden ones nor those that a program keeps while a file is open."""
    found = [path.relative_to(folder) for path in folder.rglob("*") if path.suffix.casefold() in endings]
    shown = [path for path in found if not any(part.startswith((".", "~")) for part in path.parts)]
    return sorted(shown, key=Path.as_posix)


def recording_of(file: str) -> str:
    return Path(file).stem.removesuffix(ENCLOSED)


def _without_name(why: InputError, path: Path) -> str:
    """The file is named beside it already."""
    hint = f"; {why.hint}" if why.hint else ""
    return why.message.removeprefix(f"{path.name}: ") + hint
