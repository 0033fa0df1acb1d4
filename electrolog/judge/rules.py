"""The limits a lab can set on its probes, in the trade's plain words."""

from __future__ import annotations

import math
from dataclasses import dataclass

from electrolog import units
from electrolog.errors import InputError, unknown

AT_LEAST, AT_MOST = "at least", "at most"


@dataclass(frozen=True)
class Rule:
    """One limit: `lowest` and `highest` bound what can be set; `common_practice` is offered, never assumed.

    `why` says where the common-practice value comes from, or why there is none.
    """

    name: str
    unit: units.Unit
    direction: str
    lowest: float
    highest: float
    meaning: str
    common_practice: float | None
    why: str

    def checked(self, value: float) -> float:
        """The value, if it can be a limit of this kind; InputError otherwise."""
        if math.isfinite(value) and self.lowest <= value <= self.highest:
            return value
        raise InputError(
            f"{self.name}: {units.shown_number(value)}{_sign(self.unit)} can't be a limit; accepted: "
            f"{units.shown_number(self.lowest)} to {units.shown_number(self.highest)}{_sign(self.unit)}",
            self.meaning,
        )


def _sign(unit: units.Unit) -> str:
    return f" {unit.sign}" if unit.sign else ""


_CATALOGUE = (
    Rule(
        "least-share-left",
        units.FRACTION,
        AT_LEAST,
        0.01,
        1.0,
        "share of the reference calibration's sensitivity that must be left at the end of the run",
        None,
        "no common value: it depends on how a lab corrects for the loss",
    ),
    Rule(
        "highest-detection-limit",
        units.CONCENTRATION_UM,
        AT_MOST,
        1e-6,
        1e4,
        "detection limit that the probe must still reach at the end of the run",
        None,
        "no common value: it follows from the signal expected in the tissue",
    ),
    Rule(
        "signal-to-noise",
        units.PLAIN,
        AT_LEAST,
        1.0,
        100.0,
        "how many times the noise a signal must be to count as detected",
        3.0,
        "three standard deviations: IUPAC's detection limit",
    ),
    Rule(
        "widest-interval",
        units.FRACTION,
        AT_MOST,
        0.01,
        10.0,
        "width of the 90 % interval of the sensitivity at the end of the run, as a share of its median",
        None,
        "no common value: it is the uncertainty that the lab's question can bear",
    ),
    Rule(
        "oldest-calibration",
        units.HOURS,
        AT_MOST,
        0.1,
        24 * 365.0,
        "age of the last calibration at the start of the run",
        24.0,
        "calibrated on the day of use; common practice, from memory",
    ),
    Rule(
        "largest-peak-shift",
        units.POTENTIAL_V,
        AT_MOST,
        0.001,
        1.0,
        "shift of the oxidation peak since the reference calibration, in either direction",
        None,
        "no common value: it depends on the waveform and on how analytes are told apart",
    ),
    Rule(
        "highest-noise",
        units.CURRENT_NA,
        AT_MOST,
        1e-6,
        1e3,
        "standard deviation of the signal at rest, as measured at the last calibration",
        None,
        "no common value: it depends on the filter and the size of the probe",
    ),
    Rule(
        "lowest-r-squared",
        units.PLAIN,
        AT_LEAST,
        0.0,
        1.0,
        "coefficient of determination of the last calibration",
        0.99,
        "common practice, from memory; it says little about a line of few points",
    ),
    Rule(
        "most-uses",
        units.COUNT,
        AT_MOST,
        1.0,
        1e4,
        "runs that one probe may serve, the planned one included",
        None,
        "no common value: acute probes are often used once, implanted ones for months",
    ),
    Rule(
        "accepted-risk",
        units.FRACTION,
        AT_MOST,
        0.001,
        0.5,
        "odds of breaking a limit by the end of the run that the lab accepts",
        0.05,
        "one in twenty: a convention, not a law",
    ),
    Rule(
        "cost-of-wasted-run",
        units.PLAIN,
        AT_MOST,
        1e-6,
        1e9,
        "what a run costs that is lost to a failed probe; in any unit, the same as the other cost",
        None,
        "the lab's own; an animal isn't priced by a program",
    ),
    Rule(
        "cost-of-discarded-probe",
        units.PLAIN,
        AT_MOST,
        1e-6,
        1e9,
        "what it costs to set a good probe aside; in any unit, the same as the other cost",
        None,
        "the lab's own: the hours it takes to make one",
    ),
)

RULES: dict[str, Rule] = {rule.name: rule for rule in _CATALOGUE}


def rule_named(name: str) -> Rule:
    """Raises UnknownName, with the nearest known rule."""
    if name not in RULES:
        raise unknown("limit", name, RULES)
    return RULES[name]
