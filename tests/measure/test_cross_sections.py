"""Sections of swept and united tubes against closed forms, and the marks of those that cannot be trusted."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from phantoms.skins import bent, ellipse, joined, rounded_triangle, straight, swept, united
from scipy.spatial.transform import Rotation
from scipy.special import ellipe

from geomprep.errors import InputError
from geomprep.measure.cross_sections import CutMark, CutSettings, cross_sections, smoothed_tangents


def on_axis(low: float, high: float, n: int = 40) -> np.ndarray:
    zero = np.zeros(n)
    return np.stack((zero, zero, np.linspace(low, high, n)), axis=1)


def on_bend(bend: float, n: int, angle: float = np.pi) -> np.ndarray:
    turn = np.linspace(0.02, angle - 0.02, n)
    return bend * np.stack((np.cos(turn), np.sin(turn), 0 * turn), axis=1)


def cut(mesh, stations, **further):
    return cross_sections(*mesh, stations, np.array([0, len(stations)]), **further)


def errors(mesh, stations, area: float, perimeter: float, moment: float) -> np.ndarray:
    found = cut(mesh, stations)
    assert not found.marks.any()
    return np.array(
        [
            np.abs(found.area / area - 1).max(),
            np.abs(found.perimeter / perimeter - 1).max(),
            np.abs(found.polar_moment / moment - 1).max(),
        ]
    )


def assert_second_order(coarse: np.ndarray, middle: np.ndarray, fine: np.ndarray) -> None:
    """Halving the triangles quarters the error."""
    np.testing.assert_allclose(coarse / middle, 4, rtol=0.1)
    np.testing.assert_allclose(middle / fine, 4, rtol=0.1)
    assert (fine[:2] < 0.005).all()


def test_elliptic_tube() -> None:
    """Semi-axes 2 and 1: A = 2π, P = 8 E(3/4), I = π·2·(4 + 1)/4."""
    exact = 2 * np.pi, 8 * ellipe(0.75), 2.5 * np.pi
    assert_second_order(*(errors(straight(ellipse(n, 2, 1), n), on_axis(0.3, 19.7), *exact) for n in (32, 64, 128)))
    found = cut(straight(ellipse(128, 2, 1), 40), on_axis(0.3, 19.7))
    np.testing.assert_allclose(found.hydraulic_diameter, 4 * exact[0] / exact[1], rtol=1e-3)
    np.testing.assert_allclose(found.circularity, 4 * np.pi * exact[0] / exact[1] ** 2, rtol=2e-3)
    assert found.dent.max() < 1e-12
    assert found.obliqueness.max() < 1e-6


def test_triangular_sinus() -> None:
    """Triangle of side 2 grown by ρ = 0.5: A = √3 + 6ρ + πρ², P = 6 + 2πρ (Steiner)."""
    area, perimeter = np.sqrt(3) + 3 + np.pi / 4, 6 + np.pi
    # second moment of a fine outline, whose own error is (1/64)² of the coarsest one's
    moment = cut(straight(rounded_triangle(512, 2, 0.5), 3), on_axis(1, 19, 3)).polar_moment[0]
    meshes = (straight(rounded_triangle(n, 2, 0.5), 20) for n in (8, 16, 32))
    assert_second_order(*(errors(mesh, on_axis(0.3, 19.7), area, perimeter, moment) for mesh in meshes))


def test_bent_tube() -> None:
    """A circle of radius 1 carried along a bend of radius 4: every section across is that circle."""
    exact = np.pi, 2 * np.pi, np.pi / 2
    meshes = ((bent(ellipse(n), 2 * n + 1, 4), on_bend(4, n)) for n in (32, 64, 128))
    assert_second_order(*(errors(mesh, stations, *exact) for mesh, stations in meshes))


def test_cone_is_not_oblique() -> None:
    """Radius 2 → 1 over 4: normals lean by atan(1/4), all alike."""
    z = np.linspace(0, 4, 81)
    frame = (np.tile(e, (81, 1)) for e in np.eye(3)[:2])
    mesh = swept(np.stack((0 * z, 0 * z, z), axis=1), *frame, ellipse(128) * (2 - z / 4)[:, None, None])
    stations = on_axis(0.2, 3.8)
    found = cut(mesh, stations)
    np.testing.assert_allclose(found.area, np.pi * (2 - stations[:, 2] / 4) ** 2, rtol=1e-3)
    assert found.obliqueness.max() < 1e-3
    assert not found.marks.any()


@pytest.mark.parametrize("angle", [4.0, 25.0, 50.0])
def test_oblique_planes_are_measured_and_marked(angle: float) -> None:
    """A plane at θ to the axis cuts a circle of area π into an ellipse of π/cos θ."""
    lean = np.radians(angle)
    tangents = np.tile([np.sin(lean), 0, np.cos(lean)], (10, 1))
    found = cut(straight(ellipse(256), 60), on_axis(5, 15, 10), tangents=tangents)
    np.testing.assert_allclose(found.area, np.pi / np.cos(lean), rtol=1e-3)
    np.testing.assert_allclose(found.obliqueness, lean, atol=1e-3)
    assert (found.marked(CutMark.OBLIQUE) == (angle > 10)).all()


def test_planes_through_an_opening_are_marked_open() -> None:
    """At 45° a plane through a station 0.5 before the opening runs out of a tube of radius 1."""
    tangents = np.tile([1.0, 0, 1], (2, 1))
    found = cut(straight(ellipse(64), 60), np.array([[0, 0, 19.5], [0, 0, 10.0]]), tangents=tangents)
    assert found.marks.tolist() == [CutMark.OPEN, CutMark.OBLIQUE]
    assert np.isnan(found.area).tolist() == [True, False]


def test_a_hole_in_the_wall_is_marked_open() -> None:
    points, triangles = straight(ellipse(64), 60)
    middle = points[triangles].mean(axis=1)
    whole = ~((middle[:, 0] > 0.8) & (np.abs(middle[:, 2] - 10) < 1))
    found = cut((points, triangles[whole]), on_axis(7.03, 13.03, 61))
    near = np.abs(np.linspace(7.03, 13.03, 61) - 10)
    assert (found.marks[near < 0.8] == CutMark.OPEN).all()
    assert (found.marks[near > 1.3] == 0).all()


def test_stations_outside_are_marked() -> None:
    found = cut(
        straight(ellipse(32), 20),
        np.array([[0, 0, 10.0], [3, 0, 11], [0, 0, 30]]),
        tangents=np.ones((3, 3)) * [0, 0, 1],
    )
    assert found.marks.tolist() == [0, CutMark.OUTSIDE, CutMark.OUTSIDE]
    assert np.isnan(found.centre[1:]).all()


def test_off_centre_stations_are_marked() -> None:
    """Half a radius off the axis: the area is right, the centre is the axis."""
    found = cut(straight(ellipse(128), 20), on_axis(5, 15, 5) + np.array([0.5, 0, 0]))
    assert (found.marks == CutMark.OFF_CENTRE).all()
    np.testing.assert_allclose(found.offset, 0.5, atol=1e-9)
    np.testing.assert_allclose(found.centre, on_axis(5, 15, 5), atol=1e-9)


def test_flat_lumens_are_followed_beyond_the_near_part() -> None:
    """Semi-axes 9 and 1 among other vessels: the near part of the surface ends before the lumen does."""
    found = cut(straight(ellipse(256, 9, 1), 20), on_axis(5, 15, 5))
    np.testing.assert_allclose(found.area, 9 * np.pi, rtol=1e-3)
    assert not found.marks.any()


def test_a_widening_steeper_than_allowed_is_marked() -> None:
    """Where a thin branch still runs inside its parent, the plane cuts the parent lengthwise."""
    z = np.linspace(-6, 6, 1201)
    parent = np.stack((0 * z, 0 * z, z), axis=1)
    branch = np.stack((np.linspace(0, 6, 601), *np.zeros((2, 601))), axis=1)
    stations = np.stack((np.linspace(0.15, 5, 40), *np.zeros((2, 40))), axis=1)
    found = cut(united([parent, branch], [1.0, 0.5], 0.1), stations)
    inside = stations[:, 0] < np.sqrt(1 - 0.5**2)
    assert (found.area[inside] > 2 * np.pi * 0.25).all()
    assert found.marked(CutMark.ABRUPT)[inside].all()
    outside = stations[:, 0] > 1.1
    np.testing.assert_allclose(found.area[outside], np.pi * 0.25, rtol=0.02)
    assert not found.marks[outside].any()


@pytest.mark.parametrize(("closest", "other"), [(2.0, 1.0), (1.9, 0.5), (1.6, 1.0), (1.6, 0.5), (1.2, 1.0)])
def test_fused_vessels_give_no_wrong_area_without_a_mark(closest: float, other: float) -> None:
    """Two tubes bow towards one another; their skins are one where they meet. Wrong is more than 2 % off."""
    z = np.linspace(-6, 6, 1201)
    mine = np.stack((0 * z, 0 * z, z), axis=1)
    theirs = np.stack((closest * (1 + other) / 2 + z**2 / 15, 0 * z, z), axis=1)
    found = cut(united([mine, theirs], [1.0, other], 0.12), on_axis(-5, 5, 64))
    wrong = ~(np.abs(found.area / np.pi - 1) < 0.02)
    assert np.count_nonzero(wrong) >= 4  # they do meet
    assert (found.marks[wrong] > 0).all()
    assert np.count_nonzero(found.marks == 0) >= 8
    assert not found.marks[[0, -1]].any()


@pytest.mark.parametrize("distance", [1.9, 1.0, 0.5])
def test_walls_that_run_through_one_another_are_marked(distance: float) -> None:
    """Two tubes as they were drawn, not united: my section stays π, and the other wall in it is seen."""
    mine, theirs = straight(ellipse(64), 41), straight(ellipse(64), 41)
    mesh = joined(mine, (theirs[0] + [distance, 0, 0], theirs[1]))
    found = cut(mesh, on_axis(2, 18))
    assert found.marked(CutMark.TOUCHING).all()
    np.testing.assert_allclose(found.area, np.pi, rtol=2e-3)
    apart = cut(joined(mine, (theirs[0] + [2.1, 0, 0], theirs[1])), on_axis(2, 18))
    assert not apart.marks.any()


def test_a_tube_that_runs_through_itself_is_marked() -> None:
    """One and a half turns of a spiral that rises by 1.6 a turn, less than the diameter of 2."""
    turn = np.linspace(0, 3 * np.pi, 301)
    axis = np.stack((4 * np.cos(turn), 4 * np.sin(turn), 0.8 * turn / np.pi), axis=1)
    out = np.stack((np.cos(turn), np.sin(turn), 0 * turn), axis=1)
    up = np.cross(smoothed_tangents(axis, np.array([0, 301])), out)
    mesh = swept(axis, out, -up, ellipse(64))
    found = cut(mesh, axis[2:-2:3])
    overlapping = (turn[2:-2:3] < np.pi * 0.9) | (turn[2:-2:3] > np.pi * 2.1)
    assert found.marked(CutMark.TOUCHING)[overlapping].all()
    wrong = ~(np.abs(found.area / np.pi - 1) < 0.02)
    assert (found.marks[wrong] > 0).all()
    assert not wrong.all()


def test_double_walls_are_marked_and_the_inner_one_taken() -> None:
    mesh = joined(straight(ellipse(64), 20), straight(1.3 * ellipse(64), 20))
    found = cut(mesh, on_axis(2, 18, 5))
    assert (found.marks == CutMark.TOUCHING).all()
    np.testing.assert_allclose(found.area, np.pi, rtol=2e-3)


def test_tubes_that_share_an_edge_of_the_mesh_have_no_area_and_a_mark() -> None:
    """Two square tubes with one common edge: four pieces of the cut meet there."""
    square = np.array([[1.0, 1], [-1, 1], [-1, -1], [1, -1]])
    mesh = joined(straight(square, 5), straight(square + 2, 5))
    found = cut(mesh, on_axis(2.1, 18.1, 5))
    assert (found.marks == CutMark.TOUCHING).all()
    assert np.isnan(found.area).all()


def test_beans_are_measured_and_marked() -> None:
    """r = 2 + cos 2φ dips to 1 at the sides: A = ∫r²/2 dφ = π(4 + 1/2)."""
    t = np.linspace(0, 2 * np.pi, 512, endpoint=False)
    outline = (2 + np.cos(2 * t))[:, None] * np.stack((np.cos(t), np.sin(t)), axis=1)
    found = cut(straight(outline, 10), on_axis(5, 15, 3))
    np.testing.assert_allclose(found.area, 4.5 * np.pi, rtol=1e-3)
    assert (found.marks == CutMark.INDENTED).all()


def test_how_triangles_are_stored_does_not_matter() -> None:
    """Turned over, in another order, each with corners of its own: the same sections."""
    points, triangles = bent(ellipse(24), 60, 4)
    rng = np.random.default_rng(3)
    turned = np.where(rng.random(len(triangles))[:, None] < 0.5, triangles, triangles[:, ::-1])
    loose = turned[rng.permutation(len(turned))]
    expected = cut((points, triangles), on_bend(4, 20))
    found = cut((points[loose.ravel()], np.arange(loose.size).reshape(-1, 3)), on_bend(4, 20))
    np.testing.assert_allclose(found.area, expected.area, rtol=1e-12)
    assert (found.marks == expected.marks).all()
    assert not expected.marks.any()


@settings(max_examples=15, deadline=None)
@given(st.integers(0, 2**32 - 1), st.floats(1e-4, 1e3))
def test_place_attitude_and_size_do_not_matter(seed: int, scale: float) -> None:
    turn = Rotation.random(rng=np.random.default_rng(seed)).as_matrix()
    shift = np.array([5.0, -3, 8])
    points, triangles = bent(ellipse(24, 1, 0.6), 50, 4)
    stations = on_bend(4, 12)
    expected = cut((points, triangles), stations)
    found = cut((scale * (points @ turn.T + shift), triangles), scale * (stations @ turn.T + shift))
    np.testing.assert_allclose(found.area, scale**2 * expected.area, rtol=1e-9)
    np.testing.assert_allclose(found.polar_moment, scale**4 * expected.polar_moment, rtol=1e-7)
    np.testing.assert_allclose(found.centre, scale * (expected.centre @ turn.T + shift), atol=1e-9 * scale)
    assert (found.marks == expected.marks).all()


def test_lines_are_apart() -> None:
    """A wide vessel and a narrow one, stations of both in one call, as if each were alone."""
    wide, narrow = straight(3 * ellipse(32), 20), straight(ellipse(32), 20)
    mesh = joined(wide, (narrow[0] + [10, 0, 0], narrow[1]))
    stations = np.concatenate((on_axis(5, 15, 6), on_axis(5, 15, 4) + np.array([10, 0, 0])))
    found = cross_sections(*mesh, stations, np.array([0, 6, 10]))
    assert not found.marks.any()
    np.testing.assert_allclose(found.area, np.pi * np.repeat([9, 1], [6, 4]), rtol=0.01)


def test_smoothed_tangents_are_of_second_order() -> None:
    """Helix of radius 1 and pitch 2π·0.5; halving the step quarters the largest error, ends included."""

    def error(n: int) -> float:
        t = np.linspace(0, 6, n)
        found = smoothed_tangents(np.stack((np.cos(t), np.sin(t), t / 2), axis=1), np.array([0, n]))
        exact = np.stack((-np.sin(t), np.cos(t), 0 * t + 0.5), axis=1) / np.sqrt(1.25)
        return np.linalg.norm(found - exact, axis=1).max()

    assert error(61) / error(121) == pytest.approx(4, rel=0.15)
    assert error(121) / error(241) == pytest.approx(4, rel=0.1)


def test_smoothed_tangents_of_short_lines() -> None:
    points = np.array([[0.0, 0, 0], [0, 2, 0], [5, 5, 5], [1, 0, 0], [2, 0, 0], [3, 0, 0]])
    found = smoothed_tangents(points, np.array([0, 2, 3, 6]))
    np.testing.assert_allclose(found, [[0, 1, 0], [0, 1, 0], [0, 0, 0], [1, 0, 0], [1, 0, 0], [1, 0, 0]], atol=1e-12)
    assert smoothed_tangents(np.empty((0, 3)), np.array([0])).shape == (0, 3)


def test_nothing_to_cut() -> None:
    nothing = cut((np.empty((0, 3)), np.empty((0, 3), np.int64)), on_axis(0, 1, 3))
    assert (nothing.marks == CutMark.OUTSIDE).all()
    assert len(cross_sections(*straight(ellipse(8), 3), np.empty((0, 3)), np.array([0])).area) == 0


def test_bad_input_gets_one_line() -> None:
    points, triangles = straight(ellipse(8), 3)
    stations, offsets = on_axis(5, 15, 3), np.array([0, 3])
    with pytest.raises(InputError, match="name points 0 to 99, but there are 24"):
        cross_sections(points, np.array([[0, 1, 99]]), stations, offsets)
    with pytest.raises(InputError, match=r"points: row 4 is .*nan.*must be finite"):
        cross_sections(np.where(np.arange(24)[:, None] == 4, np.nan, points), triangles, stations, offsets)
    with pytest.raises(InputError, match="must rise from 0 to 3"):
        cross_sections(points, triangles, stations, np.array([0, 2]))
    with pytest.raises(InputError, match="tangents: 2 rows for 3 stations"):
        cross_sections(points, triangles, stations, offsets, np.ones((2, 3)))
    with pytest.raises(InputError, match="tangent of station 0 has no length"):
        cross_sections(points, triangles, np.zeros((3, 3)), offsets)
    with pytest.raises(InputError, match="rows of three point numbers"):
        cross_sections(points, triangles[:, :2], stations, offsets)
    with pytest.raises(InputError, match="largest_dent = 0: it must be finite and above zero"):
        CutSettings(largest_dent=0)
    with pytest.raises(InputError, match="tangent_reach = 0"):
        CutSettings(tangent_reach=0)
