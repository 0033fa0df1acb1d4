"""How far a next calibration may stray from the truth: its line's error, its day's, what is left, and slips."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.draws import Posterior, Strand
from electrolog.fouling.fates import SLIP_SD
from electrolog.fouling.fit import CohortFit
from electrolog.fouling.parameters import read_scales

Floats = NDArray[np.float64]
GOLDEN = 0.6180339887498949


def reading_sd(fit: CohortFit, drawn: Posterior) -> Floats:
    """(D,) standard deviation of a reading about the truth under each draw, on a day that no reading is known of.

    Of the draws, as many as the odds say are on a bad day, and as many a slip: together they are the mixture.
    """
    parts = [_under(strand, fit.line_error.typical_variance) for strand in drawn.strands]
    ordinary, bad_day, slip, bad_share, slip_share = np.concatenate(parts, axis=1)
    place = (np.arange(len(ordinary)) + 0.5) * GOLDEN % 1.0
    found = np.where(place < slip_share, slip, np.where(place < slip_share + bad_share, bad_day, ordinary))
    return np.asarray(found, dtype=np.float64)


def _under(strand: Strand, line_variance: float) -> Floats:
    """(5, K S): deviations on an ordinary day, on a bad one and of a slip, and the shares of the last two."""
    scales = read_scales(strand.component.layout, strand.component.theta_draws)
    own = scales.residual_sd**2 + line_variance
    bad, slips = scales.bad_day_odds, scales.slip_odds
    rows = (
        np.sqrt(own + scales.day_sd**2),
        np.sqrt(own + scales.bad_day_sd**2),
        np.sqrt(own + scales.day_sd**2 + SLIP_SD**2),
        bad / (1.0 + bad),
        slips / (1.0 + slips),
    )
    return np.repeat(np.stack(rows), strand.level.shape[2], axis=1)
