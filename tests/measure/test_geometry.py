import math

import pytest

from electrolog.errors import InputError
from electrolog.measure.geometry import area_um2, cylinder_area_um2, disk_area_um2, per_area, per_length


def test_cylinder_with_its_tip():
    """2πrL + πr² for r = 3.5 µm, L = 100 µm: 2199.1 µm² of wall, 2237.6 with the tip (recomputed)."""
    assert cylinder_area_um2(7.0, 100.0) == pytest.approx(2237.59936751933, rel=1e-14)
    assert cylinder_area_um2(7.0, 100.0) - disk_area_um2(7.0) == pytest.approx(2199.114857512855, rel=1e-14)


def test_area_by_geometry():
    assert area_um2("disk", 10.0, None) == pytest.approx(25 * math.pi)
    assert area_um2("cylinder", 7.0, 75.0) == cylinder_area_um2(7.0, 75.0)
    assert area_um2("cylinder", 7.0, None) is area_um2("other", 7.0, 75.0) is area_um2(None, 7.0, 75.0) is None


def test_sensitivity_per_size_keeps_its_relative_error():
    area, length = per_area(20.0, 0.5, 2000.0), per_length(20.0, 0.5, 100.0)
    assert (area.value, area.se, area.unit) == (10.0, 0.25, "pA/(µM·µm²)")
    assert (length.value, length.se, length.unit) == (200.0, 5.0, "pA/(µM·µm)")
    assert per_area(20.0, None, 2000.0).se is None


@pytest.mark.parametrize("size", [0.0, -7.0, float("nan")])
def test_sizes_must_be_above_zero(size):
    with pytest.raises(InputError, match="above zero"):
        cylinder_area_um2(size, 100.0)
    with pytest.raises(InputError, match="above zero"):
        per_length(20.0, 0.5, size)
