"""What can be said of a probe before any odds: whether it can be asked about at all, and what its forecast rests on."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import datetime, timedelta

from electrolog.answers import life as lives
from electrolog.answers.asked import Asked
from electrolog.clock import shown_moment, utc_now
from electrolog.judge.facts import Reason
from electrolog.record.queries import Event

CLOCKS_AGREE_WITHIN = timedelta(minutes=5)


def unanswerable(asked: Asked, label: str) -> Reason | None:
    """Why no verdict can be given, whatever the odds; None when one can."""
    made_on = asked.probes[label]["made_on"]
    if made_on is not None and made_on > (asked.moment + timedelta(days=1)).date():
        return Reason("state", f"{label} isn't made yet: its batch is of {made_on}")
    return _from_the_future([*asked.life[label], *asked.ahead[label]])


def _from_the_future(story: Sequence[Event]) -> Reason | None:
    """An entry that hasn't happened yet came from another clock, or is a slip: the order of things is open."""
    now = utc_now()
    ahead = [event for event in story if event.at > now + CLOCKS_AGREE_WITHIN]
    if not ahead:
        return None
    more = f" and {len(ahead) - 1} more" if len(ahead) > 1 else ""
    said = f"{ahead[0].name}{more} of {shown_moment(ahead[0].at)} lies after this clock's {shown_moment(now)}"
    return Reason("clocks", f"{said}: check the clocks, or amend the entry")


def out_of_use(label: str, life: Sequence[Event], moment: datetime) -> str:
    state = lives.state(life, moment)
    if state.retired_at is None:
        return ""
    return f"{label} was retired on {shown_moment(state.retired_at)}: {state.reason}"


def notes(asked: Asked, label: str) -> tuple[str, ...]:
    """What this probe's forecast rests on, and what it can't rest on."""
    own = len(asked.cohort.readings[label, asked.assay.waveform])
    said = [] if asked.fit.converged else ["the cohort's fit did not converge: its odds are not to be relied on"]
    if own < 2:
        said.append(f"the forecast rests on {own} calibration{'s' if own != 1 else ''} of its own and on its cohort")
    return (*said, *asked.unseen(label), *asked.fit.notes, *asked.said_of(label))
