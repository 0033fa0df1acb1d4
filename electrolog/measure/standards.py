"""The concentration of a standard, from the balance and the flasks, with its uncertainty.

As the guides to the expression of uncertainty do it (JCGM 100:2008, section 5; EURACHEM/CITAC CG 4, example A1):
a product of independent factors, so that relative variances add; half-widths of tolerances become standard
uncertainties by √3 (rectangular) or √6 (triangular).
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from electrolog.errors import InputError

UM_PER_MOL_PER_L = 1e6
MG_PER_G = 1e3
ML_PER_L = 1e3

# What a salt or water of crystallisation adds to the free base or acid, in g/mol, from IUPAC's abridged standard
# atomic weights; sodium takes the place of a hydrogen.
SALTS_G_MOL = {
    "hydrochloride": 36.458,
    "hydrobromide": 80.912,
    "bitartrate": 150.086,
    "sodium": 21.982,
    "hydrate": 18.015,
}


@dataclass(frozen=True)
class Measured:
    """A value and its standard uncertainty, in the same unit."""

    value: float
    uncertainty: float = 0.0

    def __post_init__(self) -> None:
        if not (math.isfinite(self.value) and self.value > 0):
            raise InputError(f"{self.value} was found where a value above zero is needed")
        if not (math.isfinite(self.uncertainty) and self.uncertainty >= 0):
            raise InputError(f"the uncertainty {self.uncertainty} must be zero or more")

    @property
    def relative_variance(self) -> float:
        return (self.uncertainty / self.value) ** 2


def from_tolerance(value: float, half_width: float, *, triangular: bool = False) -> Measured:
    """A maker's ± without a stated confidence: rectangular, or triangular where values near the centre are likelier."""
    return Measured(value, half_width / math.sqrt(6 if triangular else 3))


@dataclass(frozen=True)
class Dilution:
    """`taken_ml` of the solution, made up to `made_up_to_ml`."""

    taken_ml: Measured
    made_up_to_ml: Measured

    def __post_init__(self) -> None:
        if self.taken_ml.value > self.made_up_to_ml.value:
            raise InputError(
                f"{self.taken_ml.value:g} mL can't be made up to {self.made_up_to_ml.value:g} mL; "
                "the second volume is the larger one"
            )


@dataclass(frozen=True)
class Prepared:
    """`budget`: each source's share of the relative variance, largest first; the shares add up to one."""

    concentration_um: float
    relative_uncertainty: float
    budget: tuple[tuple[str, float], ...]

    @property
    def uncertainty_um(self) -> float:
        return self.concentration_um * self.relative_uncertainty


def prepared(
    mass_mg: Measured,
    molar_mass_g_mol: float,
    volume_ml: Measured,
    *,
    purity: Measured | None = None,
    dilutions: Sequence[Dilution] = (),
) -> Prepared:
    """molar_mass_g_mol: of what was weighed, its salt and water of crystallisation included, per mole of analyte.

    purity: mass fraction, 0 to 1. volume_ml: of the stock, before the chain of dilutions.
    """
    pure = purity or Measured(1.0)
    if pure.value > 1:
        raise InputError(f"a purity of {pure.value:g} was found; a mass fraction of at most 1 is needed, 98 % is 0.98")
    moles = mass_mg.value / MG_PER_G * pure.value / Measured(molar_mass_g_mol).value
    stock_um = moles / (volume_ml.value / ML_PER_L) * UM_PER_MOL_PER_L
    return _diluted(stock_um, {"mass": mass_mg, "purity": pure, "volume of the stock": volume_ml}, dilutions)


def diluted(standard: Prepared, *steps: Dilution) -> Prepared:
    """A known standard, diluted further."""
    known = Measured(standard.concentration_um, standard.uncertainty_um)
    return _diluted(standard.concentration_um, {"the standard itself": known}, steps)


def _diluted(concentration_um: float, sources: dict[str, Measured], steps: Sequence[Dilution]) -> Prepared:
    for number, step in enumerate(steps, 1):
        concentration_um *= step.taken_ml.value / step.made_up_to_ml.value
        sources[f"dilution {number}, taken"] = step.taken_ml
        sources[f"dilution {number}, made up to"] = step.made_up_to_ml
    variance = sum(source.relative_variance for source in sources.values())
    shares = [(name, source.relative_variance / variance if variance else 0.0) for name, source in sources.items()]
    budget = tuple(sorted((share for share in shares if share[1] > 0), key=lambda share: -share[1]))
    return Prepared(concentration_um, math.sqrt(variance), budget)
