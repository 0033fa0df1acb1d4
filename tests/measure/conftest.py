"""Published data that several tests use, each with its source."""

import numpy as np
import pytest


@pytest.fixture
def arsenic():
    """Arsenic in water, actual and measured: Graybill & Iyer, Regression Analysis: Concepts and Applications (1994)."""
    measured = [
        [0.17, 0.25, 0.01, 0.12],
        [1.25, 0.86, 1.25, 1.10],
        [2.01, 2.03, 2.14, 1.74],
        [3.18, 2.99, 3.23, 3.37],
        [3.91, 3.90, 3.61, 4.27],
        [4.88, 5.33, 4.96, 4.98],
        [6.09, 6.17, 6.07, 5.97],
        [6.67, 7.02, 7.14, 7.30],
    ]
    return np.repeat(np.arange(8.0), 4), np.ravel(measured)


@pytest.fixture
def cadmium():
    """Cadmium at mass 111, spiked and found: Gibbons, Coleman & Maddalone, Environ. Sci. Technol. 31 (1997) 3729."""
    found = [
        [0.88, 1.57, 0.7, 0.8, 0.54, 1.83, 1.34],
        [10.17, 11.13, 11.66, 10.8, 11.11, 11.95, 11.14],
        [19.97, 20.28, 23.2, 22.12, 18.01, 24.83, 21.1],
        [54.78, 49, 51.92, 49, 54.75, 50.25, 50.03],
        [97.06, 94.6, 102.54, 101.09, 99.2, 93.71, 100.43],
    ]
    return np.repeat([0.0, 10.0, 20.0, 50.0, 100.0], 7), np.ravel(found)
