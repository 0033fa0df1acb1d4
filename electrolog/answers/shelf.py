"""The shelf: every probe with its state, age, exposure, last calibration and share left."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from datetime import date, datetime

from electrolog.answers import figures as made
from electrolog.answers import life as lives
from electrolog.answers.answer import Answer
from electrolog.answers.history import share_of
from electrolog.clock import utc_now
from electrolog.errors import unknown
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.record import queries, sheets
from electrolog.record.names import Names
from electrolog.record.queries import Event
from electrolog.record.readable import Row, row_by_id
from electrolog.record.store import Connection, Record

STATES = ("untested", "calibrated", "used", "renewed", "retired")
WIDER_STATES = ("usable", "all")


@dataclass(frozen=True)
class Shelved(Answer):
    """One probe as it lies on the shelf at the moment asked.

    trend_na_um: every reading that is comparable with the last one, oldest first.
    """

    electrode: str
    state: str
    batch: str | None
    made_by: str | None
    coating: str | None
    fibre: str | None
    age_days: int | None
    exposure_h: float
    uses: int
    calibrations: int
    last_calibration: datetime | None
    analyte: str | None
    waveform: str | None
    sensitivity_na_um: float | None
    sensitivity_se_na_um: float | None
    share_left: float | None
    reason: str | None
    exposure_by_setting_h: dict[str, float] = field(default_factory=dict)
    trend_na_um: tuple[float | None, ...] = ()


@dataclass(frozen=True)
class Filter:
    """Which probes: each part that is given must match; texts match by their beginning, whatever their case."""

    batch: str | None = None
    coating: str | None = None
    maker: str | None = None
    state: str | None = None
    analyte: str | None = None
    search: str | None = None

    def __post_init__(self) -> None:
        if self.state is not None and self.state not in (*STATES, *WIDER_STATES):
            raise unknown("state", self.state, (*STATES, *WIDER_STATES))


def shelf(record: Record, wanted: Filter, moment: datetime | None = None) -> list[Shelved]:
    """Probes that match; without a wish for retired ones these are left out of the list (never of a statistic)."""
    moment = moment or utc_now()
    with record.reading() as connection:
        probes = queries.probes(connection)
        life = queries.events(connection)
        found = queries.calibrations(connection)
        analyte = _analyte_spelled(connection, wanted.analyte)
    figures = made.all_figures(record, found)
    shelved = [_shelved(probe, life.get(probe["electrode"], []), figures, moment, analyte) for probe in probes]
    return [one for one, probe in zip(shelved, probes, strict=True) if _matches(one, probe, wanted, life)]


def _analyte_spelled(connection: Connection, name: str | None) -> str | None:
    if name is None:
        return None
    row_id = Names(connection).row_id("analytes", name)
    return str(row_by_id(connection, sheets.ANALYTES, row_id)["analyte"])


def _shelved(
    probe: Row, life: list[Event], figures: Mapping[int, CalibrationFigures], moment: datetime, analyte: str | None
) -> Shelved:
    state = lives.state(life, moment)
    past = lives.until(life, moment)
    calibrations = [e for e in lives.of(past, sheets.CALIBRATIONS) if analyte in (None, e.row["analyte"])]
    last = calibrations[-1] if calibrations else None
    own = figures[last.row["id"]] if last else None
    coatings = lives.of(past, sheets.COATINGS)
    return Shelved(
        electrode=probe["electrode"],
        state=state.name,
        batch=probe["batch"],
        made_by=probe["made_by"],
        coating=coatings[-1].row["material"] if coatings else None,
        fibre=probe["fibre"],
        age_days=_age_days(probe["made_on"], moment),
        exposure_h=sum(state.exposure_h.values()),
        uses=state.uses,
        calibrations=len(calibrations),
        last_calibration=last.at if last else None,
        analyte=last.row["analyte"] if last else None,
        waveform=last.row["waveform"] if last else None,
        sensitivity_na_um=own.sensitivity_na_um if own else None,
        sensitivity_se_na_um=own.sensitivity_se_na_um if own else None,
        share_left=_share_left(past, last, figures),
        reason=state.reason,
        exposure_by_setting_h=state.exposure_h,
        trend_na_um=_trend(calibrations, figures),
    )


def _trend(calibrations: list[Event], figures: Mapping[int, CalibrationFigures]) -> tuple[float | None, ...]:
    if not calibrations:
        return ()
    last = calibrations[-1].row
    comparable = lives.comparable_calibrations(calibrations, last["analyte"], last["waveform"])
    return tuple(figures[event.row["id"]].sensitivity_na_um for event in comparable)


def _age_days(made_on: date | None, moment: datetime) -> int | None:
    return None if made_on is None else (moment.date() - made_on).days


def _share_left(life: list[Event], last: Event | None, figures: Mapping[int, CalibrationFigures]) -> float | None:
    if last is None:
        return None
    first = lives.reference(life, last.row["analyte"], last.row["waveform"], last.at)
    if first is None:
        return None
    return share_of(figures[last.row["id"]], figures[first.row["id"]])[0]


def _matches(one: Shelved, probe: Row, wanted: Filter, life: Mapping[str, list[Event]]) -> bool:
    wide = {None: one.state != "retired", "usable": one.state != "retired", "all": True}
    in_state = wide.get(wanted.state, one.state == wanted.state)
    coating = one.coating or "none"
    checks: list[tuple[str | None, Callable[[str], bool]]] = [
        (wanted.batch, lambda text: _begins(one.batch, text)),
        (wanted.coating, lambda text: _begins(coating, text)),
        (wanted.maker, lambda text: _begins(one.made_by, text)),
        (wanted.analyte, lambda _: one.last_calibration is not None),
        (wanted.search, lambda text: _mentions(probe, life.get(one.electrode, []), text)),
    ]
    return in_state and all(test(text) for text, test in checks if text is not None)


def _begins(value: str | None, text: str) -> bool:
    return value is not None and value.casefold().startswith(text.casefold())


def _mentions(probe: Row, life: list[Event], text: str) -> bool:
    """Anything that was ever written of the probe: labels, words, notes, subjects, recordings."""
    rows = [probe, *(event.row for event in life)]
    return any(text.casefold() in str(value).casefold() for row in rows for value in row.values() if value)
