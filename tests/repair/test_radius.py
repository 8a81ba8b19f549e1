"""Radii that cannot be are mended from the points beside them; vessels that are narrow stay narrow."""

import numpy as np
import pytest

from geomprep.errors import InputError
from geomprep.model import Basis, Centrelines
from geomprep.repair import RadiusSettings, Verdict, Verdicts, mend_radii

N = 41


def line(radius: np.ndarray, spacing: float = 0.5) -> Centrelines:
    """One straight line; radii in mm."""
    points = np.stack((np.arange(len(radius)) * spacing, np.zeros(len(radius)), np.zeros(len(radius))), axis=1) * 1e-3
    n = len(radius)
    return Centrelines(points, radius * 1e-3, points, np.arange(n), [0, n], [1], [0], np.zeros(n))


def mended(radius: np.ndarray, **changes: object):
    return mend_radii(line(radius), RadiusSettings(**changes), Verdicts())


def taper() -> np.ndarray:
    return 2.0 * np.exp(-0.01 * np.arange(N))


@pytest.mark.parametrize("bad", [0.0, -1.0, np.nan, np.inf])
@pytest.mark.parametrize("where", [[17], [17, 18, 19], [0], [N - 1, N - 2]])
def test_impossible_radii_take_the_value_between_their_neighbours(bad: float, where: list[int]) -> None:
    truth = taper()
    radius = truth.copy()
    radius[where] = bad
    result = mended(radius)
    found = result.centrelines.radius * 1e3
    if 0 in where or N - 1 in where:  # beyond the last good point the radius goes on unchanged
        np.testing.assert_allclose(found[where], truth[1] if 0 in where else truth[N - 3], rtol=1e-12)
    else:  # ln r is linear here, so the fit is exact
        np.testing.assert_allclose(found, truth, rtol=1e-12)
    (repair,) = result.repairs
    assert repair.kind == "impossible radius"
    assert (result.centrelines.radius_basis[where] == Basis.INTERPOLATED).all()
    assert repair.conductance_before == 0.0
    assert repair.conductance_after > 0


@pytest.mark.parametrize("factor", [0.3, 0.6, 1.8, 4.0])
@pytest.mark.parametrize("where", [[20], [20, 21], [10, 25]])
def test_spikes(factor: float, where: list[int]) -> None:
    truth = taper()
    radius = truth.copy()
    radius[where] *= factor
    result = mended(radius)
    np.testing.assert_allclose(result.centrelines.radius * 1e3, truth, rtol=1e-12)
    assert {repair.kind for repair in result.repairs} == {"radius spike"}


def test_decay_at_an_open_end() -> None:
    radius = np.full(N, 2.0)
    radius[:3] = [0.2, 0.6, 1.1]
    result = mended(radius)
    np.testing.assert_allclose(result.centrelines.radius * 1e3, 2.0)
    (repair,) = result.repairs
    assert repair.kind == "decayed end"


@pytest.mark.parametrize(
    "radius",
    [
        taper(),
        np.where(np.arange(N) < 20, 3.0, 1.5),  # a step
        3.0 - 1.8 * np.exp(-(((np.arange(N) - 20) / 3.0) ** 2)),  # a narrowing over several points
        np.where((np.arange(N) >= 18) & (np.arange(N) < 22), 1.0, 2.5),  # a short narrowing with sharp edges
        2.0 * np.exp(0.05 * np.random.default_rng(0).normal(size=N)),  # 5 % noise
        2.0 * 0.93 ** np.arange(N),  # a steep taper to its end
    ],
    ids=["taper", "step", "narrowing", "sharp narrowing", "noise", "steep taper"],
)
def test_what_may_be_a_vessel_is_left(radius: np.ndarray) -> None:
    result = mended(radius)
    assert result.repairs == ()
    assert np.array_equal(result.centrelines.radius, line(radius).radius)


def test_twice_is_once_and_off_is_off() -> None:
    radius = taper()
    radius[[5, 20]] = [0.0, 9.0]
    once = mended(radius)
    again = mend_radii(once.centrelines, RadiusSettings(), Verdicts())
    assert again.repairs == ()
    assert mended(radius, use=False).repairs == ()


def test_a_person_may_keep_a_spike_but_not_a_radius_of_nothing() -> None:
    radius = taper()
    radius[20] *= 3
    (repair,) = mended(radius).repairs
    left = mend_radii(line(radius), RadiusSettings(), Verdicts({repair.id: Verdict("leave", "person")}))
    assert np.array_equal(left.centrelines.radius, line(radius).radius)
    assert left.repairs[0].verdict_by == "person"
    radius[20] = 0.0
    (repair,) = mended(radius).repairs
    with pytest.raises(InputError, match="no choice there"):
        mend_radii(line(radius), RadiusSettings(), Verdicts({repair.id: Verdict("leave", "person")}))


def test_a_line_without_any_good_radius_stays_for_joining_to_refuse() -> None:
    result = mended(np.zeros(10))
    assert result.repairs == ()
    assert (result.centrelines.radius == 0).all()


def test_daughters_first_point_with_the_trunks_radius_is_no_spike() -> None:
    trunk = np.stack((np.arange(21) * 0.5, np.zeros(21), np.zeros(21)), axis=1)
    branch = np.stack((np.full(21, 5.0), np.arange(21) * 0.5, np.zeros(21)), axis=1)
    points = np.concatenate((trunk, branch)) * 1e-3
    radius = np.concatenate((np.full(21, 3.0), [3.0], np.full(20, 1.0))) * 1e-3
    both = Centrelines(points, radius, points, np.arange(42), [0, 21, 42], [1, 1], [0, 0], np.zeros(42))
    assert mend_radii(both, RadiusSettings(), Verdicts()).repairs == ()


@pytest.mark.parametrize("seed", range(10))
def test_five_percent_outliers_cost_less_than_two_percent_of_resistance(seed: int) -> None:
    random = np.random.default_rng(10_000 + seed)
    truth = 2.0 * np.exp(0.1 * np.sin(np.arange(200) / 15))
    radius = truth * np.exp(0.01 * random.normal(size=200))
    outliers = random.choice(np.arange(2, 198), 10, replace=False)
    radius[outliers] *= np.where(random.random(10) < 0.5, random.uniform(0.2, 0.6, 10), random.uniform(1.7, 4.0, 10))
    found = mended(radius).centrelines.radius * 1e3
    assert (found**-4.0).mean() / (truth**-4.0).mean() == pytest.approx(1.0, abs=0.02)


@pytest.mark.parametrize("changes", [{"spike_ratio": 1.0}, {"end_ratio": 1.0}, {"end_ratio": -0.1}])
def test_settings_out_of_range(changes: dict[str, float]) -> None:
    with pytest.raises(InputError, match=r"repair\.radius"):
        RadiusSettings(**changes)


@pytest.mark.parametrize("nothing", [0.0, np.nan])
def test_a_decay_that_ends_in_no_radius_at_all_is_a_decay(nothing: float) -> None:
    """A distance map falls to zero at the end of a skeleton: the points before it are as wrong as the last one."""
    radius = np.full(N, 2.0)
    radius[:3] = [nothing, 0.5, 1.1]  # all below 0.6 of what is further in
    result = mended(radius)
    np.testing.assert_allclose(result.centrelines.radius * 1e3, 2.0, rtol=1e-12)


def test_a_spike_at_an_open_end_is_one() -> None:
    radius = np.full(N, 2.0)
    radius[-1] = 6.0
    result = mended(radius)
    np.testing.assert_allclose(result.centrelines.radius * 1e3, 2.0, rtol=1e-12)
    assert [repair.kind for repair in result.repairs] == ["radius spike"]


@pytest.mark.parametrize(("spacing", "goes"), [(0.9, True), (2.0, False)])
def test_a_run_of_three_is_a_spike_only_within_a_radius(spacing: float, goes: bool) -> None:
    """Three points of a third of the radius: within 1.8 mm of a vessel of 2 mm no lumen narrows so; over 4 mm it may."""
    radius = np.full(N, 2.0)
    radius[20:23] = 0.7
    result = mend_radii(line(radius, spacing), RadiusSettings(), Verdicts())
    assert bool(result.repairs) is goes
