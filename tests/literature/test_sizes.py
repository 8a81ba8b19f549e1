"""Published sizes as radii, and the interval of radii that they make plausible."""

from __future__ import annotations

import pytest

from geomprep.errors import InputError
from geomprep.literature import plausible_radius, row, size_rows


@pytest.mark.parametrize(
    ("key", "low", "mean", "high"),
    # diameters in mm, all SEEN; printed minimum and maximum where there are any, else mean ± 2 SD by hand
    [
        ("size-a1-shatri-2017", 1.1, 2.09, 2.93),
        ("size-anterior-communicating-shatri-2017", 0.9, 1.5, 2.4),
        ("size-middle-cerebral-shatri-2017", 2.45, 3.35, 4.34),
        ("size-internal-carotid-shatri-2017", 2.81, 3.79, 4.2),
        ("size-posterior-communicating-shatri-2017", 0.9, 1.22, 2.1),
        ("size-p1-shatri-2017", 0.9, 1.99, 2.8),
        ("size-basilar-shatri-2017", 1.9, 3.27, 4.15),
        ("size-common-carotid-women-krejza-2006", 4.50, 6.10, 7.70),
        ("size-left-transverse-sinus-2024", 2.67, 5.37, 8.07),
        ("size-internal-jugular-ct-cc8200", 5.1, 15.5, 25.9),
        ("size-vena-cava-at-a-glance", 30, 30, 30),
    ],
)
def test_diameters(key: str, low: float, mean: float, high: float) -> None:
    one = row(key)
    assert one.checked == "seen"
    assert (one.low, one.value, one.high) == pytest.approx((low / 2e3, mean / 2e3, high / 2e3), rel=1e-12)


@pytest.mark.parametrize(
    ("key", "low", "high"),
    # Magnano et al. 2016, doi 10.1371/journal.pone.0149532: areas SEEN; equivalent diameters in mm derived outside
    # the package: 27.2 → 5.885, 41.6 → 7.278, 47.8 → 7.801, 82.0 → 10.218
    [
        ("size-internal-jugular-upper-magnano-2016", 5.885, 7.278),
        ("size-internal-jugular-lower-magnano-2016", 7.801, 10.218),
    ],
)
def test_areas_become_radii(key: str, low: float, high: float) -> None:
    one = row(key)
    assert one.value is None
    assert (one.low, one.high) == pytest.approx((low / 2e3, high / 2e3), abs=3e-7)


@pytest.mark.parametrize(
    ("vessel_class", "low", "high"),
    # by hand in mm: smallest row 0.9/2 (communicating arteries), 2.67/2 (left transverse sinus), a third of it;
    # largest row 25/2 (aorta), 30/2 (vena cava), 1.25 times it
    [("artery", 0.15, 15.625), ("vein", 0.445, 18.75), ("any", 0.15, 18.75)],
)
def test_plausible_interval(vessel_class: str, low: float, high: float) -> None:
    assert plausible_radius(vessel_class) == pytest.approx((low * 1e-3, high * 1e-3), rel=1e-12)


def test_rows_by_class() -> None:
    arteries, veins = size_rows("artery"), size_rows("vein")
    assert {one.vessel_class for one in arteries} == {"artery"}
    assert {one.vessel_class for one in veins} == {"vein"}
    assert set(size_rows("any")) == set(arteries) | set(veins)
    for one in size_rows("any"):
        assert one.low is not None and one.high is not None
        assert 0 < one.low <= one.high
        assert one.value is None or one.low <= one.value <= one.high


def test_other_classes_are_refused() -> None:
    for call in (size_rows, plausible_radius):
        with pytest.raises(InputError, match="'unknown' has no sizes; choose one of artery, vein, any"):
            call("unknown")
