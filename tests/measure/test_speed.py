import time

import numpy as np

from electrolog.measure.line import fit_lines


def test_many_lines_in_one_call_leave_a_loop_far_behind():
    """Processor time per five-point line, against scipy.stats.linregress in a loop; measured over 500, asked 50."""
    from scipy.stats import linregress

    x = np.array([0, 0.25, 0.5, 1, 2])
    y = 20 * x + np.random.default_rng(0).normal(0, 0.5, (100_000, 5))
    fit_lines(x, y[:10])
    linregress(x, y[0])
    begun = time.process_time()
    many = fit_lines(x, y)
    together = (time.process_time() - begun) / 100_000
    begun = time.process_time()
    slopes = [linregress(x, row).slope for row in y[:500]]
    one_by_one = (time.process_time() - begun) / 500
    assert np.allclose(many.slope_na_um[:500], slopes, rtol=1e-12)
    assert one_by_one > 50 * together
