"""All probes asked about at once: their cards, and thinned draws of their forecasts; large shelves are kept on disk.

What is kept is a cache and no part of the record: it can be thrown away at any time. A probe's part holds as long as
the cohort's fit is the same, nothing was corrected, and nothing more was logged of the probe.
"""

from __future__ import annotations

import io
import json
import zipfile
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from datetime import datetime
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from electrolog.answers import cache, cards, fits
from electrolog.answers.asked import Asked, Floats, Run, ask
from electrolog.answers.cards import Card, card_of
from electrolog.answers.checking import standards_of
from electrolog.answers.cohorts import REFERENCE_SETTING
from electrolog.answers.fits import Assay
from electrolog.fouling.fit import CohortFit
from electrolog.fouling.kept_draws import Arrays, packed, thinned, unpacked
from electrolog.record import queries
from electrolog.record.names import Names
from electrolog.record.store import Record

ALL_DRAWS, FEWER_DRAWS = 1 << 20, 512
LARGE = 400  # probes; below, a forecast is made as fast as it would be read
VERSION = 3
REFERENCE = "reference"


@dataclass(frozen=True)
class Board:
    assay: Assay
    setting: str
    fit: CohortFit
    cards: tuple[Card, ...]
    arrays: Arrays
    draws: int
    moment: datetime

    @property
    def log_references(self) -> Floats:
        return np.asarray(self.arrays[REFERENCE])

    def log_sensitivity_in(self, setting: str) -> Callable[[float], Floats]:
        """Minutes of run in that setting -> (U, D)."""
        settings = tuple(dict.fromkeys((REFERENCE_SETTING, setting)))
        drawn = unpacked(self.fit, self.arrays, settings, self.draws)

        def log_sensitivity_at(run_min: float) -> Floats:
            hours = np.zeros((len(self.cards), len(settings)))
            hours[:, settings.index(setting)] = run_min / 60
            return drawn.log_sensitivity(hours)

        return log_sensitivity_at


@dataclass(frozen=True)
class _Kept:
    """keys: per probe, how much of its life was seen."""

    stamp: str
    keys: dict[str, str]
    cards: dict[str, Card]
    arrays: Arrays


def board(record: Record, labels: Sequence[str] | None, run: Run, moment: datetime) -> Board:
    """The named probes, or all that aren't retired. Raises UnknownName."""
    with record.reading() as connection:
        assay = fits.assay(connection, run.analyte, run.waveform)
        setting = Names(connection).word("setting", run.setting)
        seen = queries.lives_seen(connection, moment)
    wanted = list(seen) if labels is None else list(dict.fromkeys(labels))
    if labels is not None or len(wanted) < LARGE:
        return Board(assay, setting, *_fresh(record, wanted, run, moment, ALL_DRAWS), ALL_DRAWS, moment)
    fit, correction = fits.fit_for(record, assay, units=()), fits.corrected_last(record, assay)
    path = cache.path_of(record, "shelf.npz", assay.analyte, assay.waveform)
    stamp = f"{VERSION} {fit.method} {fit.fingerprint} {correction}"
    kept = _read(path, stamp)
    good = {label: None for label in wanted if _holds(kept, label, seen[label], moment)}
    missing = [label for label in wanted if label not in good]
    own, made_cards, made = _fresh(record, missing, run, moment, FEWER_DRAWS) if missing else (fit, (), {})
    if own.fingerprint != fit.fingerprint:  # corrected meanwhile: what is kept rests on another fit
        return board(record, labels, run, moment)
    known = [kept.cards[label] for label in good] if kept else []
    arrays = _together(kept, list(good), made)
    found = Board(assay, setting, fit, (*known, *made_cards), arrays, FEWER_DRAWS, moment)
    if len(missing) > len(good) / 20:
        _write(path, stamp, seen, found)
    return found


def in_order(found: Board) -> Board:
    """The same probes by label, whichever of them were kept."""
    order = sorted(range(len(found.cards)), key=lambda place: found.cards[place].electrode)
    arrays = {name: values[order] for name, values in found.arrays.items()}
    return replace(found, cards=tuple(found.cards[place] for place in order), arrays=arrays)


def _fresh(
    record: Record, labels: Sequence[str], run: Run, moment: datetime, draws: int
) -> tuple[CohortFit, tuple[Card, ...], Arrays]:
    asked: Asked = ask(record, labels, run, moment)
    with record.reading() as connection:
        standards = standards_of(connection, asked)
    arrays = packed(asked.posterior, draws) | {REFERENCE: thinned(asked.posterior, asked.log_references(), draws)}
    return asked.fit, tuple(card_of(asked, label, standards) for label in asked.labels), arrays


def _holds(kept: _Kept | None, label: str, seen: str, moment: datetime) -> bool:
    if kept is None or kept.keys.get(label) != seen:
        return False
    last_event_at = kept.cards[label].last_event_at
    return last_event_at is None or last_event_at <= moment


def _together(kept: _Kept | None, good: Sequence[str], made: Arrays) -> Arrays:
    if kept is None or not good:
        return made
    places = {label: place for place, label in enumerate(kept.cards)}
    chosen = np.array([places[label] for label in good], dtype=np.int64)
    whole = len(chosen) == len(places)
    found = {name: values if whole else values[chosen] for name, values in kept.arrays.items()}
    return {name: np.concatenate([values, made[name]]) for name, values in found.items()} if made else found


def _read(path: Path, stamp: str) -> _Kept | None:
    """None where there is nothing, or nothing that can be read: it is made again then."""
    try:
        with path.open("rb") as opened, np.load(opened, allow_pickle=False) as file:
            told = json.loads(file["told"].tobytes())
            if told["stamp"] != stamp:
                return None
            arrays = {name: file[name] for name in file.files if name != "told"}
            read = {kept["electrode"]: cards.from_dict(kept) for kept in told["cards"]}
            return _Kept(stamp, told["keys"], read, arrays)
    except (OSError, ValueError, KeyError, TypeError, zipfile.BadZipFile):
        return None


def _write(path: Path, stamp: str, seen: dict[str, str], found: Board) -> None:
    lasting = [place for place, card in enumerate(found.cards) if card.lasts]
    kept = [found.cards[place] for place in lasting]
    told = {
        "stamp": stamp,
        "keys": {card.electrode: seen[card.electrode] for card in kept},
        "cards": [cards.to_dict(card) for card in kept],
    }
    text = np.frombuffer(json.dumps(told).encode(), dtype=np.uint8)
    arrays: dict[str, NDArray[np.uint8] | NDArray[np.float32]] = {"told": text}
    arrays |= {name: values[lasting] for name, values in found.arrays.items()}
    packed_file = io.BytesIO()
    np.savez(packed_file, **arrays)  # type: ignore[arg-type]
    cache.write(path, packed_file.getvalue())
