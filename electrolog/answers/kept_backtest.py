"""The last backtest of an analyte, kept for reports: it takes minutes, and a report may not take them unasked.

It is a cache and no part of the record: it can be thrown away at any time, and `electrolog backtest` makes it again. It
holds as long as the record has grown from the state that was tested and the method is the same.
"""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import asdict, dataclass
from datetime import datetime
from typing import TYPE_CHECKING, Any

import numpy as np

from electrolog.answers import cache
from electrolog.clock import utc_now
from electrolog.fouling.fit import METHOD
from electrolog.record import journal, queries, seen_by_fit
from electrolog.record.names import Names
from electrolog.record.store import Record

if TYPE_CHECKING:
    from electrolog.answers.backtesting import Backtest

VERSION = 1
NONE_MADE = "none has been made of this record by the present method on this machine"


@dataclass(frozen=True)
class KeptBacktest:
    """A backtest, when it was made, and how the record has changed since: calibrations more, or any correction."""

    found: Backtest
    made_at: datetime
    calibrations_since: int
    corrected_since: bool


@dataclass(frozen=True)
class State:
    """Of a record, as far as a backtest sees it: the journal's newest entry and what there was to be forecast."""

    entries: int
    head: str
    readings: int
    correction: int

    @classmethod
    def of(cls, record: Record, analyte: str) -> State:
        """Raises UnknownName."""
        with record.reading() as connection:
            seen = seen_by_fit.to_be_seen(connection, Names(connection).row_id("analytes", analyte))
            return cls(*journal.head(connection), seen.readings, seen.correction)


def keep(record: Record, found: Backtest, state: State) -> None:
    """state: as it was before the backtest began; what came in meanwhile was not tested."""
    told = {"stamp": _stamp(), "made_at": utc_now(), "state": asdict(state), "found": asdict(found)}
    cache.write(_path(record, found.analyte), json.dumps(told, default=_plain).encode())


def kept(record: Record, analyte: str) -> KeptBacktest | None:
    """None where none was made here, or of a record that this one has not grown from. Raises UnknownName."""
    now = State.of(record, analyte)
    try:
        told = json.loads(_path(record, analyte).read_bytes())
        if told["stamp"] != _stamp():
            return None
        then, found = State(**told["state"]), _backtest(told["found"])
    except (OSError, ValueError, KeyError, TypeError):
        return None  # nothing there, or nothing that can be read: it is made again then
    with record.reading() as connection:
        if not queries.grew_from(connection, then.entries, then.head):
            return None
    more, corrected = max(0, now.readings - then.readings), now.correction != then.correction
    return KeptBacktest(found, datetime.fromisoformat(told["made_at"]), more, corrected)


def _path(record: Record, analyte: str) -> Any:
    return cache.path_of(record, "backtest.json", analyte)


def _stamp() -> str:
    return f"{VERSION} {METHOD}"


def _plain(value: object) -> Any:
    if isinstance(value, datetime):
        return value.isoformat()
    if isinstance(value, np.ndarray | np.generic):
        return value.tolist()
    raise TypeError(f"{type(value).__name__} has no place in a kept backtest")


def _backtest(told: Mapping[str, Any]) -> Backtest:
    from electrolog.answers.backtesting import Backtest, Cut, Forecast
    from electrolog.judge.backtest import FitVerdicts

    return Backtest(
        analyte=told["analyte"],
        cuts=tuple(Cut(**{**one, "at": _moment(one["at"])}) for one in told["cuts"]),
        methods=tuple(_scored(one) for one in told["methods"]),
        verdicts=None if told["verdicts"] is None else FitVerdicts(**told["verdicts"]),
        no_verdicts=told["no_verdicts"],
        forecasts=tuple(
            Forecast(**{**one, "at": _moment(one["at"]), "cut": _moment(one["cut"])}) for one in told["forecasts"]
        ),
        notes=tuple(told["notes"]),
    )


def _scored(told: Mapping[str, Any]) -> Any:
    from electrolog.judge.backtest import Scored
    from electrolog.judge.scores import Coverage

    values = {
        "coverage": tuple(Coverage(**one) for one in told["coverage"]),
        "pit_counts": tuple(told["pit_counts"]),
        "crps_each": np.array(told["crps_each"]),
        "pit": np.array(told["pit"]),
    }
    return Scored(**{**told, **values})


def _moment(text: str) -> datetime:
    return datetime.fromisoformat(text)
