"""Detection limits by each route, against the standards' own numbers."""

import math

import numpy as np
import pytest

from electrolog.errors import DataError, InputError
from electrolog.measure import detection
from electrolog.measure.line import fit_line


def test_currie_with_a_known_blank():
    """IUPAC 1995 (Currie, Pure Appl. Chem. 67 (1995) 1699): 1.645 σ0, 3.29 σ0, 10 σ0 (from memory)."""
    limits = detection.currie(1.0, 1.0)
    assert (round(limits.critical_um, 3), round(limits.lod_um, 2), limits.loq_um) == (1.645, 3.29, 10)


def test_currie_with_paired_blanks():
    """The same source: 2.33 σB and 4.65 σB (from memory)."""
    limits = detection.currie(1.0, 1.0, paired=True)
    assert (round(limits.critical_um, 2), round(limits.lod_um, 2)) == (2.33, 4.65)


@pytest.mark.parametrize(
    ("freedom", "t", "shift"),
    [(1, 6.31375, 12.529), (4, 2.13185, 4.06728), (10, 1.81246, 3.54304), (50, 1.67591, 3.33536)],
)
def test_currie_with_an_estimated_blank(freedom, t, shift):
    """Currie gives t = 2.13 and δ = 4.07 for 4 degrees of freedom; the rest recomputed from the noncentral t."""
    limits = detection.currie(1.0, 1.0, freedom)
    assert limits.critical_um == pytest.approx(t, rel=3e-6)
    assert limits.lod_um == pytest.approx(shift, rel=3e-6)


def test_fluorescein_three_sigma():
    """Miller & Miller, ch. 5: the detection limit is 0.67 pg/mL, at the signal a + 3·s(y/x) = 2.82 (from memory)."""
    fit = fit_line([0, 2, 4, 6, 8, 10, 12], [2.1, 5.0, 9.0, 12.6, 17.3, 21.0, 24.7])
    limits = detection.from_residuals(fit.residual_sd_na, fit.slope_na_um)
    assert round(limits.lod_um, 2) == 0.67
    assert round(fit.intercept_na + 3 * fit.residual_sd_na, 2) == 2.82
    assert limits.loq_um == pytest.approx(limits.lod_um * 10 / 3)


def test_prediction_bands_of_cadmium(cadmium):
    """Millard & Neerchal (2001), pp. 566-575: 7.677842 (signal) and 12.36467.

    The page says α = β = 0.01; its numbers come from a two-sided 99 % band, that is one-sided 0.995.
    """
    fit = fit_line(*cadmium)
    limits = detection.hubaux_vos(fit, confidence=0.995)
    assert round(fit.intercept_na + fit.slope_na_um * limits.critical_um, 6) == 7.677842
    assert round(limits.lod_um, 5) == 12.36467


def test_iso_11843_from_the_line(cadmium):
    """ISO 11843-2: x_C = t·(s/b)·√(1/K + 1/n + x̄²/Sxx) and x_D = δ·(the same), δ ≈ 2t for many degrees of freedom."""
    fit = fit_line(*cadmium)
    limits = detection.iso_11843(fit, replicates=3)
    x = fit.concentration_um
    root = math.sqrt(1 / 3 + 1 / x.size + x.mean() ** 2 / ((x - x.mean()) ** 2).sum())
    sd_um = fit.residual_sd_na / fit.slope_na_um * root
    assert limits.critical_um == pytest.approx(1.6923603 * sd_um, rel=1e-7)  # t(0.95, 33), from tables
    assert limits.lod_um == pytest.approx(2 * limits.critical_um, rel=0.01)
    assert limits.lod_um < 2 * limits.critical_um


def test_a_detection_limit_is_missed_once_in_twenty():
    """Simulated: blanks are called present 5 % of the time, samples at the limit are missed 5 % of the time."""
    random, freedom, tries = np.random.default_rng(2), 6, 40000
    sd = np.sqrt(random.chisquare(freedom, tries) / freedom)
    limits = detection.currie(1.0, 1.0, freedom)
    critical = limits.critical_um * sd
    assert (random.normal(0, 1, tries) > critical).mean() == pytest.approx(0.05, abs=0.005)
    assert (random.normal(limits.lod_um, 1, tries) < critical).mean() == pytest.approx(0.05, abs=0.005)


def test_k_is_stated_in_the_route():
    assert detection.from_noise(0.1, 20).route == "3 × the signal's noise / sensitivity"
    limits = detection.from_blanks([0.1, -0.1, 0.2, -0.2], 20, k=3.3)
    assert limits.route.startswith("3.3 × standard deviation of 4 blanks")
    assert limits.lod_um == pytest.approx(3.3 * np.std([0.1, -0.1, 0.2, -0.2], ddof=1) / 20)


def test_no_limit_without_a_response():
    flat = fit_line([0, 1, 2, 3], [1, 3, -2, 1])
    for route in (detection.iso_11843, detection.hubaux_vos):
        with pytest.raises(DataError, match="told from zero"):
            route(flat)
    with pytest.raises(InputError, match="sensitivity"):
        detection.from_noise(0.1, -20)
    with pytest.raises(DataError, match="blank"):
        detection.from_blanks([0.1], 20)


def test_a_hardly_seen_slope_never_parts_the_bands():
    barely = fit_line([0, 1, 2, 3, 4], [0, 9, 7, 9, 16])
    assert barely.slope_na_um / barely.slope_se_na_um > 3
    with pytest.raises(DataError, match="never part"):
        detection.hubaux_vos(barely, confidence=0.995)


def test_a_range_below_the_detection_limit_is_flagged():
    assert "0.01 µM, below the detection limit of 0.05 µM" in detection.claimed_below_detection(0.01, 0.05)
    assert detection.claimed_below_detection(0.05, 0.05) is None
    assert detection.claimed_below_detection(0.01, None) is None
