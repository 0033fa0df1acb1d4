"""Which volumes give the concentrations of a flow-cell calibration from a stock."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from electrolog.errors import InputError

USUAL_UM = (0.25, 0.5, 1.0, 2.0)
FLASKS_ML = (1.0, 2.0, 5.0, 10.0, 20.0, 25.0, 50.0, 100.0, 200.0, 250.0, 500.0, 1000.0)
SMALLEST_ML = 0.01  # common practice: below 10 µL a pipette's error counts for more than 1 %


@dataclass(frozen=True)
class Step:
    """Take `take_ml` of `source_um` and make it up with diluent to `make_up_to_ml`."""

    source_um: float
    take_ml: float
    make_up_to_ml: float
    concentration_um: float

    @property
    def diluent_ml(self) -> float:
        return self.make_up_to_ml - self.take_ml


@dataclass(frozen=True)
class DilutionPlan:
    """`intermediate` is needed where the stock is too strong to be pipetted at once."""

    intermediate: Step | None
    steps: tuple[Step, ...]


def plan_dilutions(
    stock_um: float,
    wanted_um: Sequence[float] = USUAL_UM,
    *,
    volume_ml: float = 50.0,
    smallest_ml: float = SMALLEST_ML,
) -> DilutionPlan:
    """`volume_ml` of each concentration; no pipetted volume is below `smallest_ml`.

    Raises InputError for a concentration above the stock, or one that a single intermediate can't reach.
    """
    _refuse_what_cannot_be(stock_um, wanted_um, volume_ml, smallest_ml)
    if min(wanted_um) / stock_um * volume_ml >= smallest_ml:
        return DilutionPlan(None, _steps(stock_um, wanted_um, volume_ml))
    for factor in (2, 5, 10, 20, 50, 100, 200, 500, 1000, 2000, 5000, 10000):
        source_um = stock_um / factor
        steps = _steps(source_um, wanted_um, volume_ml)
        flask_ml = _flask_ml(max(sum(step.take_ml for step in steps), smallest_ml * factor))
        takes_enough = min(step.take_ml for step in steps) >= smallest_ml
        if takes_enough and max(wanted_um) <= source_um and flask_ml is not None:
            return DilutionPlan(Step(stock_um, flask_ml / factor, flask_ml, source_um), steps)
    raise InputError(
        f"no single intermediate leads from {stock_um:g} µM to {min(wanted_um):g} … {max(wanted_um):g} µM with "
        f"{volume_ml:g} mL each and nothing below {smallest_ml:g} mL pipetted",
        "make a weaker stock first, or more of each",
    )


def _steps(source_um: float, wanted_um: Sequence[float], volume_ml: float) -> tuple[Step, ...]:
    return tuple(Step(source_um, volume_ml * wanted / source_um, volume_ml, wanted) for wanted in wanted_um)


def _flask_ml(least_ml: float) -> float | None:
    return next((flask for flask in FLASKS_ML if flask >= least_ml * (1 - 1e-9)), None)


def _refuse_what_cannot_be(stock_um: float, wanted_um: Sequence[float], volume_ml: float, smallest_ml: float) -> None:
    values = (stock_um, volume_ml, smallest_ml, *wanted_um)
    if not wanted_um or not all(math.isfinite(value) and value > 0 for value in values):
        raise InputError("stock, volumes and wanted concentrations must all be above zero, and one must be wanted")
    if max(wanted_um) > stock_um:
        raise InputError(f"{max(wanted_um):g} µM can't be made from a stock of {stock_um:g} µM")
