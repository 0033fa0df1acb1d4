"""The verdict's sentences: plain words, with the numbers and their units."""

from __future__ import annotations

from electrolog.judge.facts import Reason
from electrolog.judge.odds import LONGEST_MIN, NEEDS, SHARE
from electrolog.judge.rules import RULES
from electrolog.judge.value import ValueOfCalibration
from electrolog.units import shown_concentration, shown_duration, shown_number, shown_percent

Spread = tuple[float, float, float]


def chance(p: float) -> str:
    """Odds from a finite number of draws: none at all is still no proof that it can't happen."""
    if p < 0.01:
        return "<1 %"
    return ">99 %" if p > 0.99 else shown_percent(p)


def share_left(share: Spread, least: float, p: float) -> Reason:
    low, middle, high = (shown_share(value) for value in share)
    text = (
        f"{middle} of the reference sensitivity left at the end (90 % interval {low} to {high}); "
        f"the limit is {shown_percent(least)}: odds of breaking it {chance(p)}"
    )
    return Reason("least-share-left", text)


def shown_share(share: float | None) -> str:
    """A share of sensitivity may well be 100 % or more, unlike odds."""
    if share is None:
        return "?"
    return "<1 %" if share < 0.01 else f"{share * 100:.0f} %"


def _shown_detection(lod_um: float) -> str:
    return "over 1 M" if lod_um > 1e6 else shown_concentration(lod_um)


def detection_limit(rule: str, lod_um: Spread, most_um: float, p: float, times: float, rests_on: str) -> Reason:
    low, middle, high = (_shown_detection(value) for value in lod_um)
    asked = "needed" if rule == NEEDS else "the limit is"
    text = (
        f"detection limit at the end {middle} (90 % interval {low} to {high}; {shown_number(times)} × {rests_on}); "
        f"{asked} {shown_concentration(most_um)}: odds of breaking it {chance(p)}"
    )
    return Reason(rule, text)


def width(found: float, most: float) -> Reason:
    text = f"the sensitivity's 90 % interval at the end is {found * 100:.0f} % wide; the limit is {most * 100:.0f} %"
    return Reason("widest-interval", text)


def together(p: float, risk: float) -> Reason:
    return Reason("odds", f"odds of breaking any of them {chance(p)}; accepted {shown_risk(risk)}")


def shown_risk(risk: float) -> str:
    return f"{risk * 100:.2g} %"


def broken_already(p_now: float) -> Reason:
    return Reason("odds", f"broken already now, before the run: odds {chance(p_now)}")


def beyond_saving(p_now: float, chance_fit: float) -> Reason:
    saved = f"{chance(chance_fit)} that a calibration would clear it for any run"
    text = f"odds {chance(p_now)} that it is broken already, and {saved}"
    return Reason("odds", text)


def run_too_long(longest_min: float | None, value: ValueOfCalibration) -> Reason:
    hardly = f"a calibration would hardly make it fit for this one ({chance(value.chance_fit)})"
    if longest_min is None:
        text = f"the run is too long for it, and {hardly}: take another probe"
    elif longest_min > 0:
        shorter = shown_duration(longest_min)
        text = f"the run is too long for it, and {hardly}: shorten it to {shorter} or take another probe"
    else:
        shorter = f"for a shorter one it might ({chance(value.chance_any_run)})"
        text = f"no run stays within the accepted risk as things stand; {hardly}, {shorter}: take another probe"
    return Reason("run-length", text)


def unset(rule: str) -> Reason:
    known = RULES[rule]
    offered = f"; common practice: {_shown(known.common_practice, rule)}" if known.common_practice else ""
    return Reason(rule, f"{rule} isn't set ({known.meaning}){offered}")


def _shown(value: float | None, rule: str) -> str:
    unit = RULES[rule].unit
    return shown_risk(value or 0.0) if rule == "accepted-risk" else f"{shown_number(value)} {unit.sign}".strip()


def nothing_asked() -> Reason:
    text = "nothing says what the probe must still do at the end: set least-share-left or highest-detection-limit, "
    return Reason("least-share-left", text + "or give the smallest signal to be seen (--needs)")


def untold(rule: str) -> Reason:
    if rule == SHARE:
        return Reason(rule, "the share left can't be told: there is no reference calibration")
    text = "the detection limit can't be told: the last calibration has neither noise nor points enough to show it"
    return Reason(rule, text)


def shorten(longest_min: float) -> str:
    more = " or more" if longest_min >= LONGEST_MIN else ""
    return f"shorten the run to {shown_duration(longest_min)}{more}: the longest that stays within the accepted risk"


def recalibrate(value: ValueOfCalibration) -> str:
    text = f"recalibrate now: chance {chance(value.chance_fit)} that it is fit then"
    if value.p_breach_if_fit is not None:
        text += f" (odds of a breach then {chance(value.p_breach_if_fit)} on average"
        text += f", otherwise {chance(value.p_breach_if_not)})" if value.p_breach_if_not is not None else ")"
    return text


def clean_first(method: str, p_before: float, p_after: float) -> str:
    return (
        f"clean first ({method}): the odds of a breach fall from {chance(p_before)} to {chance(p_after)} "
        "by this lab's own recovery; calibrate after it"
    )


def in_short(p: float) -> Reason:
    return Reason("odds", f"odds of a breach by the end {chance(p)}")
