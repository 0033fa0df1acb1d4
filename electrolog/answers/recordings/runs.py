"""The runs that a folder of recordings tells of, logged as exposures: tried first, written as a whole."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from datetime import datetime, tzinfo
from pathlib import Path

from electrolog.answers.answer import Answer
from electrolog.answers.recordings.candidates import (
    Candidate,
    Folder,
    Given,
    Tell,
    plain_files,
)
from electrolog.answers.recordings.listed import LIST, read_list, write_list
from electrolog.answers.recordings.naming import Labels
from electrolog.answers.recordings.standing import Standing, read_from
from electrolog.answers.signal_files import fingerprint
from electrolog.errors import InputError, unknown
from electrolog.record import sheets
from electrolog.record.books.drafts import Draft, Extract
from electrolog.record.books.taking_in import take_in, unique
from electrolog.record.books.vocabulary import Vocabulary, vocabulary
from electrolog.record.columns import Value
from electrolog.record.names import Names
from electrolog.record.store import Record

THERE, REPEATED, DOUBTFUL, REFUSED = "there already", "repeated", "doubtful", "refused"
WAITING = "waits for an answer"


@dataclass(frozen=True)
class FoundRun:
    """`state`: new, there already, filled in, left struck, repeated (another file tells of the same run), doubtful
    (wants a yes), refused, or waits for an answer.
    """

    file: str
    state: str
    electrode: str
    electrode_from: str
    start: datetime | None
    duration_min: float | None
    setting: str | None
    subject: str | None
    waveform: str | None
    said: tuple[str, ...]


@dataclass(frozen=True)
class Runs(Answer):
    """`questions`: what no file tells, without which nothing is written. `unlisted`: files that a list must date."""

    folder: str
    committed: bool
    runs: tuple[FoundRun, ...]
    questions: tuple[str, ...]
    unlisted: tuple[str, ...]

    def count(self, state: str) -> int:
        return sum(run.state == state for run in self.runs)


@dataclass(frozen=True)
class Asking:
    """How a folder is to be read, and whether to write: `confirmed` writes what is doubtful too."""

    given: Given = field(default_factory=Given)
    commit: bool = False
    confirmed: bool = False
    zone: tzinfo | None = None


@dataclass(frozen=True)
class FileOrigin:
    """The file of each draft, by its place, with its SHA-256: kept as the reason of its journal entry."""

    files: Mapping[str, tuple[str, str]]

    def of(self, draft: Draft) -> str:
        return read_from(*self.files[draft.place]) if draft.place in self.files else ""


def runs(record: Record, folder: Path, asking: Asking, tell: Tell) -> Runs:
    """Nothing is written without `commit`, and then all that is new or nothing.

    Raises InputError for a folder or a list that can't be read, UnknownName for a setting, waveform or probe typed
    that the record doesn't know, and InputError on `commit` while a question is open.
    """
    with record.reading() as connection:
        names = Names(connection)
        _refuse_unknown(asking.given, names)
        labels = Labels(spelling for spelling, _ in names.everything("electrodes").values())
        known, standing = vocabulary(connection), Standing.of(connection)
    found = list(Folder(folder, asking.zone, asking.given, labels).candidates(tell))
    standing.settle(found)
    _check_words(found, known)
    questions = _questions(found, known)
    listed = {row.file for row in read_list(folder)}
    unlisted = tuple(name for name in plain_files(folder) if name not in listed)
    if asking.commit and questions:
        raise InputError(f"nothing was written, since this is not known: {'; '.join(questions)}")
    states = {} if questions else _taken_in(record, _to_write(found, asking.confirmed), asking.commit, tell)
    told = tuple(_told(one, states.get(id(one), ""), bool(questions), asking.confirmed) for one in found)
    return Runs(str(folder), asking.commit, told, questions, unlisted)


def list_recordings(record: Record, folder: Path, asking: Asking, tell: Tell) -> Path:
    """Writes the folder's list for a person to fill in: a row per file, with what is known of it already."""
    if (folder / LIST).exists():
        write_list(folder, ())
    found = runs(record, folder, asking, tell)
    rows = [{"file": one.file, "probe": one.electrode, "setting": one.setting or ""} for one in found.runs]
    rows += [{"file": name, "setting": asking.given.setting or ""} for name in found.unlisted]
    if not rows:
        raise InputError(f"{folder} holds no recording; accepted: .nwb, .csv, .npy, .h5")
    return write_list(folder, sorted(rows, key=lambda row: row["file"]))


def _refuse_unknown(given: Given, names: Names) -> None:
    """Raises UnknownName."""
    if given.setting is not None:
        names.word("setting", given.setting)
    if given.waveform is not None:
        names.row_id("waveforms", given.waveform)
    for label in filter(None, (given.probe, *given.probes.values())):
        names.row_id("electrodes", label)


def _check_words(found: Sequence[Candidate], known: Vocabulary) -> None:
    for one in found:
        for column, words in (("setting", known.settings), ("medium", known.media)):
            text = one.texts.get(column)
            if text and text.casefold() not in words:
                one.refusals.append(unknown(column, text, words.values()).message)


def _questions(found: Sequence[Candidate], known: Vocabulary) -> tuple[str, ...]:
    asked = [one for one in found if _is_open(one) and not one.texts.get("setting")]
    if not asked:
        return ()
    words = ", ".join(known.settings.values())
    return (f"setting: where was the probe in {_counted(asked)}? --setting, or a column of {LIST}; accepted: {words}",)


def _counted(asked: Sequence[Candidate]) -> str:
    return asked[0].file if len(asked) == 1 else f"{len(asked)} recordings"


def _to_write(found: Sequence[Candidate], confirmed: bool) -> list[Candidate]:
    return [one for one in found if _is_open(one) and (confirmed or not one.doubts)]


def _is_open(one: Candidate) -> bool:
    return not (one.refusals or one.there or one.repeats)


def _taken_in(record: Record, chosen: Sequence[Candidate], commit: bool, tell: Tell) -> dict[int, str]:
    """What becomes of each candidate, by its id; what a rule of the record refuses is said of it."""
    often = Counter(one.file for one in chosen)
    places = {f"{one.file} ({one.probe})" if often[one.file] > 1 else one.file: one for one in chosen}
    origins = {}
    for done, (place, one) in enumerate(places.items()):
        tell("files fingerprinted", done)
        origins[place] = (one.file, (one.sha256 or fingerprint(one.path)) if commit else "")
    out = Extract([Draft("exposures", _values(one, origins[place][1]), place) for place, one in places.items()])
    drafts = unique(out)
    states = take_in(record, drafts, out, FileOrigin(origins), commit)
    for remark in out.remarks:
        places[remark.place].refusals.append(remark.said)
    return {id(places[draft.place]): states.get(id(draft), "") for draft in drafts}


def _values(one: Candidate, sha256: str) -> dict[str, Value]:
    origin = f"from {one.file}" + (f" ({sha256[:12]})" if sha256 else "")
    note = "; ".join(filter(None, (one.texts.get("note"), origin)))
    return {
        "electrode": one.probe,
        "start": one.start,
        "duration_min": one.duration_min,
        "recording": one.recording,
        **{name: one.texts.get(name) for name in sheets.EXPOSURES.by_name if name in one.texts},
        "note": note,
    }


def _told(one: Candidate, state: str, waiting: bool, confirmed: bool) -> FoundRun:
    if one.refusals:
        state = REFUSED
    elif one.there:
        state = THERE
    elif one.repeats:
        state = REPEATED
    elif one.doubts and not confirmed:
        state = DOUBTFUL
    elif waiting:
        state = WAITING
    same = f"the same run as {one.repeats}" if one.repeats else ""
    said = (*one.refusals, *filter(None, (one.there, same)), *one.doubts, *one.said)
    return FoundRun(
        one.file, state, one.probe, one.probe_from, one.start, one.duration_min, one.texts.get("setting"),
        one.texts.get("subject"), one.texts.get("waveform"), tuple(dict.fromkeys(said)),
    )  # fmt: skip
