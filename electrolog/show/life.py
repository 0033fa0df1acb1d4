"""A probe's life as a timeline."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from electrolog.answers import life as lives
from electrolog.answers.handling import split
from electrolog.clock import shown_moment, utc_now
from electrolog.record import sheets
from electrolog.record.queries import Event
from electrolog.record.readable import Row
from electrolog.show.entries import plain_name, shown
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import print_lines, print_table
from electrolog.units import counted, shown_number

_ELSEWHERE = ("id", "electrode", "at", "start", "calibration")


def answer(probe: Row, events: Sequence[Event], json: bool, csv: bool) -> None:
    state = lives.state(events, utc_now())
    rows = [{"at": event.at, "event": event.sheet.one, **_known(event)} for event in events]
    if json:
        print_json({"electrode": _identity(probe), "state": state, "events": rows})
    elif csv:
        told = [{"at": e.at, "event": e.sheet.one, "number": e.row["id"], "what": what_happened(e)} for e in events]
        print_csv(told, ("at", "event", "number", "what"))
    else:
        print_lines(_identity_line(probe), _state_line(state))
        print_table(
            ("when", "event", "what"), [(shown_moment(e.at), e.name, what_happened(e)) for e in events], wrapped="what"
        )


def _known(event: Event) -> dict[str, Any]:
    known = {name: value for name, value in event.row.items() if value is not None}
    return {"number": known.pop("id"), **known}


def _identity(probe: Row) -> dict[str, Any]:
    return {name: plain(value) for name, value in probe.items() if name != "id"}


def _identity_line(probe: Row) -> str:
    parts = [probe["electrode"], f"batch {probe['batch']}" if probe["batch"] else "no batch"]
    parts += [f"made {probe['made_on']}"] if probe["made_on"] else []
    parts += [f"by {probe['made_by']}"] if probe["made_by"] else []
    parts += [probe["fibre"]] if probe["fibre"] else []
    parts += [f"exposed {shown_number(probe['exposed_length_um'])} µm"] if probe["exposed_length_um"] else []
    parts += [probe["note"]] if probe["note"] else []
    return ", ".join(str(part) for part in parts)


def _state_line(state: lives.State) -> str:
    hours = ", ".join(f"{shown_number(h)} h {setting}" for setting, h in sorted(state.exposure_h.items()))
    why = f" ({state.reason})" if state.reason else ""
    return f"{state.name}{why}; exposed {hours or 'never'}; {counted(state.uses, 'use')}"


def what_happened(event: Event) -> str:
    if event.sheet is sheets.CALIBRATIONS:
        row = event.row
        note, _ = split(row["note"])
        said = {**{name: row[name] for name in ("standard", "rig", "by")}, "note": note}
        rest = {name: value for name, value in said.items() if value is not None}
        return ", ".join([row["stage"], row["analyte"], row["waveform"], *_said(event, rest)])
    return ", ".join(_said(event, event.row))


def _said(event: Event, values: Row) -> list[str]:
    return [
        f"{plain_name(name)} {shown(event.sheet.name, name, value)}"
        for name, value in values.items()
        if value is not None and name not in _ELSEWHERE
    ]
