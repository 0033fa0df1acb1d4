"""From a shelf to the success tables that the assignment of a week's runs works with."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from electrolog.errors import InputError
from electrolog.judge import facts as last
from electrolog.judge import odds
from electrolog.judge.assign import SuccessTable
from electrolog.judge.shelf import Shelf, noise_draws


def success_table(shelf: Shelf, wear_min: ArrayLike) -> SuccessTable:
    """Odds that each probe breaks no limit after so many minutes more in the shelf's setting.

    A run of next week finds its probe calibrated anew, so the age of today's calibration is no bar. What is one: out of
    use, never calibrated, a limit broken that no calibration could change, or one that can't be told; those rows are
    NaN. wear_min: (G,) rising from 0, at least two. `shelf.run_min` isn't used.
    """
    grid = np.asarray(wear_min, dtype=float)
    if grid.size < 2 or grid[0] != 0 or (np.diff(grid) <= 0).any():
        raise InputError("the minutes of a success table must rise from 0")
    ends = odds.EndLimits.of(shelf.limits, shelf.needs_um)
    noise_na = noise_draws(shelf.calibrations, shelf.reference_log_sensitivity.shape[1])
    least = odds.least_log_sensitivity(odds.Beside(shelf.reference_log_sensitivity, noise_na), ends)
    success = [1 - odds.below(shelf.log_sensitivity_at(float(minutes)), least).mean(axis=1) for minutes in grid]
    p_success = np.stack(success, axis=1)
    p_success[~_usable(shelf, ends, ~np.isnan(noise_na[:, 0]))] = np.nan
    return SuccessTable(grid, p_success)


def _usable(shelf: Shelf, ends: odds.EndLimits, has_noise: odds.Mask) -> odds.Mask:
    told = np.full(len(has_noise), bool(ends.by_rule))
    if odds.SHARE in ends.by_rule:
        told &= ~np.isnan(shelf.reference_log_sensitivity[:, 0])
    if odds.LOD in ends.by_rule or odds.NEEDS in ends.by_rule:
        told &= has_noise
    there = [
        facts is not None and not why and not last.measured(facts, uses, shelf.limits).final
        for facts, why, uses in zip(shelf.calibrations, shelf.out_of_use, shelf.uses, strict=True)
    ]
    return np.asarray(told & np.array(there, dtype=bool))
