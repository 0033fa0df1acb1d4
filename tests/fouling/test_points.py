"""The few normal quantiles of one probe agree with scipy's, so that many and few draws are the same."""

import numpy as np
from scipy.special import ndtri

from electrolog.fouling.points import FEW, normal_quantiles


def test_few_quantiles_are_scipys() -> None:
    level = np.concatenate([[1e-12, 1 - 1e-12], np.linspace(0.001, 0.999, 997)]).reshape(3, 333)
    assert np.abs(normal_quantiles(level) - ndtri(level)).max() < 1e-12


def test_many_have_the_same_shape() -> None:
    assert normal_quantiles(np.full((FEW + 2, 2), 0.5)).shape == (FEW + 2, 2)
