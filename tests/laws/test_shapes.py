"""Friction shapes against the velocity fields that solve the equation, and the relations' stated errors."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.sparse import csc_array
from scipy.sparse.linalg import spsolve
from scipy.special import ellipe

from geomprep.errors import InputError
from geomprep.laws.shapes import (
    ellipse_friction_shape,
    friction_shape,
    friction_shape_from_moment,
    triangle_friction_shape,
)

TRIANGLE_AREA, TRIANGLE_MOMENT = np.sqrt(3) / 4, np.sqrt(3) / 48  # of side 1
SIDES = 2 * np.pi * np.arange(3) / 3
NORMALS = np.stack((np.cos(SIDES), np.sin(SIDES)), axis=1)  # outward, height 1: inscribed radius 1/3


def ellipse(ratio: float) -> tuple[float, float, float]:
    """Area, perimeter and polar moment with semi-axes `ratio` and 1."""
    return np.pi * ratio, 4 * ratio * ellipe(1 - ratio**-2), np.pi * ratio * (ratio**2 + 1) / 4


def grid(half: float, n: int = 801) -> tuple[np.ndarray, np.ndarray, float]:
    along = np.linspace(-half, half, n)
    x, y = np.meshgrid(along, along, indexing="ij")
    return x, y, along[1] - along[0]


def shape_of(velocity: np.ndarray, step: float) -> float:
    """A²/(8π Q) at μ = G = 1, for a velocity that is zero outside the lumen."""
    inside = velocity > 0
    return shape_of_flux(inside.sum() * step**2, velocity[inside].sum() * step**2)


def laplacian(velocity: np.ndarray, step: float) -> np.ndarray:
    inner = velocity[1:-1, 1:-1]
    around = velocity[2:, 1:-1] + velocity[:-2, 1:-1] + velocity[1:-1, 2:] + velocity[1:-1, :-2]
    return (around - 4 * inner) / step**2


@pytest.mark.parametrize("ratio", [1.0, 2.0, 3.0, 5.0])
def test_ellipse_is_the_flux_of_its_velocity_field(ratio: float) -> None:
    x, y, step = grid(1.1 * ratio)
    velocity = ratio**2 / (2 * (ratio**2 + 1)) * (1 - (x / ratio) ** 2 - y**2)
    np.testing.assert_allclose(laplacian(velocity, step), -1, rtol=1e-7)
    assert ellipse_friction_shape(ratio) == pytest.approx(shape_of(velocity, step), rel=2e-3)


def test_triangle_is_the_flux_of_its_velocity_field() -> None:
    x, y, step = grid(0.7)
    distance = 1 / 3 - np.einsum("ik,kjl->ijl", NORMALS, np.stack((x, y)))
    velocity = np.where((distance > 0).all(axis=0), distance.prod(axis=0), 0)
    np.testing.assert_allclose(laplacian(distance.prod(axis=0), step), -1, rtol=1e-6)
    assert triangle_friction_shape() == pytest.approx(shape_of(velocity, step), rel=2e-3)


def test_values_of_the_house_table() -> None:
    """Same area, axis ratio 2/3/5: 1.25/1.67/2.6; triangle 1.38 (derived above)."""
    assert ellipse_friction_shape([2, 3, 5]) == pytest.approx([1.25, 5 / 3, 2.6])
    assert triangle_friction_shape() == pytest.approx(1.38, abs=0.005)


@pytest.mark.parametrize(
    ("ratio", "elliptic", "triangular"), [(2, 0.001, -0.067), (3, 0.007, -0.195), (5, 0.019, -0.305)]
)
def test_stated_errors_on_ellipses(ratio: float, elliptic: float, triangular: float) -> None:
    area, perimeter, moment = ellipse(ratio)
    exact = ellipse_friction_shape(ratio)
    assert friction_shape(area, perimeter) / exact - 1 == pytest.approx(elliptic, abs=0.001)
    assert friction_shape(area, perimeter, "triangular") / exact - 1 == pytest.approx(triangular, abs=0.001)
    assert friction_shape_from_moment(area, moment) == pytest.approx(exact, rel=1e-12)


def test_stated_errors_on_the_triangle() -> None:
    exact = triangle_friction_shape()
    assert friction_shape(TRIANGLE_AREA, 3.0) / exact - 1 == pytest.approx(0.358, abs=0.001)
    assert friction_shape(TRIANGLE_AREA, 3.0, "triangular") == pytest.approx(exact, rel=1e-12)
    assert friction_shape_from_moment(TRIANGLE_AREA, TRIANGLE_MOMENT) / exact - 1 == pytest.approx(-0.1227, abs=1e-4)


def test_rounded_triangles_lie_between_circle_and_triangle() -> None:
    """A triangle of height 1 grown by ρ: A + Pρ + πρ², P + 2πρ, so compactness falls from 12√3 to 4π."""
    rho = np.array([0.0, 0.1, 1.0, 1e6])
    area, perimeter = 1 / np.sqrt(3) + 2 * np.sqrt(3) * rho + np.pi * rho**2, 2 * np.sqrt(3) + 2 * np.pi * rho
    shape = friction_shape(area, perimeter, "triangular")
    assert (np.diff(shape) < 0).all()
    assert shape[[0, -1]] == pytest.approx([triangle_friction_shape(), 1.0], rel=1e-9)


def solved_shape(depth: np.ndarray, step: float, area: float) -> float:
    """Friction shape of the region where `depth` > 0, from −∇²u = 1 solved on the grid.

    Five-point differences; the wall cuts an arm of the star where the depth, taken linear, is zero.
    """
    inside = depth > 0
    number = np.full(depth.shape, -1)
    number[inside] = np.arange(inside.sum())
    here, diagonal, rows, columns = number[inside], np.zeros(inside.sum()), [], []
    for axis, way in ((0, 1), (0, -1), (1, 1), (1, -1)):
        there = np.roll(number, way, axis)[inside]
        within = there >= 0
        beyond = np.where(within, 0, np.roll(depth, way, axis)[inside])
        diagonal += 1 / np.clip(depth[inside] / (depth[inside] - beyond), 1e-3, 1)  # 1 within
        rows.append(here[within])
        columns.append(there[within])
    values = np.concatenate((-np.ones(sum(map(len, rows))), diagonal))
    place = np.concatenate((*rows, here)), np.concatenate((*columns, here))
    velocity = spsolve(csc_array((values / step**2, place)), np.ones(len(here)))
    return shape_of_flux(area, velocity.sum() * step**2)


def shape_of_flux(area: float, flux: float) -> float:
    return area**2 / (8 * np.pi * flux)


@pytest.mark.parametrize(
    ("rounding", "elliptic", "triangular", "moment"), [(0.1, 0.14, -0.023, -0.11), (0.4, 0.037, -0.012, -0.06)]
)
def test_stated_errors_on_rounded_triangles(rounding: float, elliptic: float, triangular: float, moment: float) -> None:
    """Side 1, grown by a disc: A = √3/4 + 3ρ + πρ², P = 3 + 2πρ; moment summed over the grid."""
    x, y, step = grid(0.62 + 1.05 * rounding, 161)
    inner = np.sqrt(3) / 6 - np.einsum("ik,kjl->ijl", NORMALS, np.stack((x, y)))
    corner = np.exp(2j * np.pi * (np.arange(3) + 0.5) / 3) / np.sqrt(3)
    place = x + 1j * y
    apart = np.full(x.shape, np.inf)
    for first, last in zip(corner, np.roll(corner, -1), strict=True):
        along = np.clip(((place - first) * np.conj(last - first)).real, 0, 1)
        apart = np.minimum(apart, np.abs(place - first - along * (last - first)))
    depth = rounding + np.where((inner > 0).all(axis=0), apart, -apart)
    area, perimeter = TRIANGLE_AREA + 3 * rounding + np.pi * rounding**2, 3 + 2 * np.pi * rounding
    exact = solved_shape(depth, step, area)
    assert friction_shape(area, perimeter) / exact - 1 == pytest.approx(elliptic, abs=0.004)
    assert friction_shape(area, perimeter, "triangular") / exact - 1 == pytest.approx(triangular, abs=0.004)
    second = (x**2 + y**2)[depth > 0].sum() * step**2
    assert friction_shape_from_moment(area, second) / exact - 1 == pytest.approx(moment, abs=0.01)


@pytest.mark.parametrize("waves", [2, 3, 4])
def test_slopes_of_circles_with_waves(waves: int) -> None:
    """r = 1 + ε cos nφ: 1 + 2(n − 1)ε² for κ = 1 + (n² − 1)ε²/2, so the elliptic line fits n = 2, the parabola n = 3."""
    height = 0.1
    x, y, step = grid(1.2, 241)
    depth = 1 + height * np.cos(waves * np.arctan2(y, x)) - np.hypot(x, y)
    area = np.pi * (1 + height**2 / 2)
    exact = solved_shape(depth, step, area)
    assert exact - 1 == pytest.approx(2 * (waves - 1) * height**2, rel=0.05)


@given(st.floats(1.0, 20.0), st.floats(1e-6, 1e3))
def test_the_size_does_not_matter(ratio: float, scale: float) -> None:
    area, perimeter, moment = ellipse(ratio)
    assert friction_shape(scale**2 * area, scale * perimeter) == pytest.approx(
        friction_shape(area, perimeter), rel=1e-9
    )
    scaled = friction_shape_from_moment(scale**2 * area, scale**4 * moment)
    assert scaled == pytest.approx(ellipse_friction_shape(ratio), rel=1e-9)


def test_unmeasured_stays_unmeasured() -> None:
    assert np.isnan(friction_shape([np.nan], [np.nan])).all()
    assert np.isnan(friction_shape_from_moment([np.nan], [np.nan])).all()


def test_impossible_outlines_are_refused() -> None:
    with pytest.raises(InputError, match=r"0\.25: no outline lies below 1.*check the units"):
        friction_shape(np.pi, np.pi)
    with pytest.raises(InputError, match=r"no outline lies below 1.*centre of area"):
        friction_shape_from_moment(np.pi, 0.1)
    with pytest.raises(InputError, match="area = -1"):
        friction_shape(-1.0, 1.0)
    with pytest.raises(InputError, match="outline 'square': it must be elliptic or triangular"):
        friction_shape(1.0, 4.0, "square")
