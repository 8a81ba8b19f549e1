"""Areas from masks against closed forms of the shapes that were put on the grid."""

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.spatial import cKDTree
from scipy.spatial.transform import Rotation

from geomprep.curves import arc_length, piece_integrals
from geomprep.errors import InputError
from geomprep.measure.mask_areas import VoxelGrid, mask_areas

MM = VoxelGrid(np.zeros(3), np.ones(3), np.eye(3))
DUCT = np.array([[1.5, 1.5, 2.0], [1.5, 1.5, 4.5], [1.5, 1.5, 7.0]])


def one_line(stations: np.ndarray) -> np.ndarray:
    return np.array([0, len(stations)])


def centres(low: np.ndarray, high: np.ndarray, step: float) -> tuple[np.ndarray, VoxelGrid]:
    """Voxel centres (a, b, c, 3) of a grid that covers a box."""
    counts = np.ceil((high - low) / step).astype(int)
    index = np.stack(np.meshgrid(*map(np.arange, counts), indexing="ij"), axis=-1)
    return low + step * index, VoxelGrid(low, np.full(3, step), np.eye(3))


def tapered_error(seed: int, voxels: float, aligned: bool) -> float:
    """Relative error of ∫ds/r⁴ on a cone 2:1 whose narrow end is so many voxels wide, at any attitude and shift."""
    rng = np.random.default_rng(seed)
    narrow, length = voxels / 2, 12 * voxels / 2
    wide = 2 * narrow
    axis = np.eye(3)[2] if aligned else Rotation.random(rng=rng).as_matrix()[2]
    distance = np.linspace(0, length, 25)  # half the narrow radius
    stations = distance[:, None] * axis
    low, high = stations.min(axis=0) - wide - 2, stations.max(axis=0) + wide + 2
    place, grid = centres(low + rng.random(3), high, 1.0)
    along = place @ axis
    apart = np.sqrt(np.maximum((place**2).sum(axis=-1) - along**2, 0))
    mask = (apart <= wide + (narrow - wide) * along / length) & (along > -2) & (along < length + 2)
    found = mask_areas(mask, grid, stations, one_line(stations))
    assert not found.empty.any()
    radius = np.sqrt(found.area / np.pi)
    got = piece_integrals(np.diff(distance), radius[:-1], radius[1:])[:, 3].sum()
    exact = length * (wide**2 + wide * narrow + narrow**2) / (3 * wide**3 * narrow**3)
    return got / exact - 1


@pytest.mark.parametrize("voxels", [6, 9])
def test_resistance_of_tapered_tubes(voxels: int) -> None:
    """∫ds/r⁴ within 5 % in the median and 10 % at the 95th percentile."""
    errors = np.abs([tapered_error(seed, voxels, aligned) for seed in range(16) for aligned in (False, True)])
    assert np.median(errors) < 0.05
    assert np.quantile(errors, 0.95) < 0.10


def test_square_duct_is_exact() -> None:
    found = mask_areas(np.ones((4, 4, 10), bool), MM, DUCT, one_line(DUCT))
    np.testing.assert_allclose(found.area, 16, rtol=1e-12)
    np.testing.assert_allclose(found.length, [1.25, 2.5, 1.25])
    # 10 layers from −0.5 to 9.5, of which 2 to 7 are used
    assert found.unassigned_volume == pytest.approx(16 * 5)


@pytest.mark.parametrize("step", [0.13, 0.5, 0.77, 1.0, 1.9, 3.3])
def test_layers_do_not_beat_with_the_stations(step: float) -> None:
    """Whatever the spacing of stations is to that of the layers."""
    z = np.arange(1, 9, step)
    stations = np.stack((0 * z + 1.5, 0 * z + 1.5, z), axis=1)
    np.testing.assert_allclose(
        mask_areas(np.ones((4, 4, 10), bool), MM, stations, one_line(stations)).area, 16, rtol=1e-9
    )


def test_bent_tube_keeps_its_area() -> None:
    """Circle of radius 4 along a bend of radius 12: area π·16 at every station (Pappus)."""
    place, grid = centres(np.array([-18.3, -18.1, -6.2]), np.array([18.0, 18, 6]), 0.5)
    ring = np.hypot(place[..., 0], place[..., 1])
    turn = np.linspace(0.3, 2.8, 25)
    stations = 12 * np.stack((np.cos(turn), np.sin(turn), 0 * turn), axis=1)
    found = mask_areas(np.hypot(ring - 12, place[..., 2]) <= 4, grid, stations, one_line(stations), farthest=6.0)
    chords = arc_length(stations, one_line(stations))[-1] / (12 * 2.5)
    np.testing.assert_allclose(found.area[1:-1], 16 * np.pi / chords, rtol=0.02)


def test_volumes_add_up() -> None:
    """Two lines that cross a random mask: what is not theirs is said."""
    rng = np.random.default_rng(5)
    mask = rng.random((12, 12, 12)) < 0.4
    stations = rng.uniform(0, 11, (9, 3))
    found = mask_areas(mask, MM, stations, np.array([0, 4, 9]), farthest=4.0)
    assert found.volume.sum() + found.unassigned_volume == pytest.approx(mask.sum())
    assert found.unassigned_volume > 0


def test_stations_without_voxels_are_marked() -> None:
    mask = np.ones((4, 4, 10), bool)
    mask[:, :, 5:] = False
    z = np.arange(1.0, 9)
    stations = np.stack((0 * z + 1.5, 0 * z + 1.5, z), axis=1)
    found = mask_areas(mask, MM, stations, one_line(stations))
    # the mask ends at 4.5, where the length of the station at 4 ends, too
    assert found.empty.tolist() == [False] * 4 + [True] * 4
    assert np.isnan(found.area[4:]).all()
    np.testing.assert_allclose(found.area[:4], 16)


def test_voxels_far_away_are_left_out() -> None:
    mask = np.zeros((20, 4, 10), bool)
    mask[:4] = mask[16:] = True
    near = mask_areas(mask, MM, DUCT, one_line(DUCT), farthest=3.0)
    np.testing.assert_allclose(near.area, 16)
    np.testing.assert_allclose(mask_areas(mask, MM, DUCT, one_line(DUCT)).area, 32)


def test_radius_tells_a_wide_vessel_from_a_thin_neighbour() -> None:
    """Tubes of radius 6 and 2 whose walls touch: the wide one's wall is nearer to the thin one's axis."""
    place, grid = centres(np.array([-8.2, -8.1, -4]), np.array([12.0, 8, 24]), 0.5)
    wide = np.hypot(place[..., 0], place[..., 1]) <= 6
    thin = np.hypot(place[..., 0] - 8.2, place[..., 1]) <= 2
    z = np.linspace(0, 20, 11)
    stations = np.concatenate([np.stack((0 * z + x, 0 * z, z), axis=1) for x in (0, 8.2)])
    radius = np.repeat([6.0, 2.0], 11)
    weighted = mask_areas(wide | thin, grid, stations, np.array([0, 11, 22]), radius)
    # every layer cuts the thin tube alike: its 52 voxels instead of 50.3 do not average out
    np.testing.assert_allclose(weighted.area, np.pi * radius**2, rtol=0.05)
    plain = mask_areas(wide | thin, grid, stations, np.array([0, 11, 22]))
    assert (plain.area[11:] > 2 * np.pi * 4).all()


@pytest.mark.parametrize("order", list(itertools.permutations(range(3))))
def test_axes_may_stand_in_any_order_and_sense(order: tuple[int, int, int]) -> None:
    """The same voxels with axes exchanged and the first one reversed; left-handed ones among them."""
    rng = np.random.default_rng(1)
    mask = rng.random((6, 7, 12)) < 0.6
    stations = np.array([[2.0, 3, 1], [3, 3, 5], [2, 3, 9]])
    expected = mask_areas(mask, MM, stations, one_line(stations))
    turned = mask.transpose(order)[::-1]
    directions = np.eye(3)[:, order] * [-1, 1, 1]
    origin = (mask.shape[order[0]] - 1) * np.eye(3)[order[0]]
    found = mask_areas(turned, VoxelGrid(origin, np.ones(3), directions), stations, one_line(stations))
    np.testing.assert_allclose(found.area, expected.area, rtol=1e-9)


@settings(max_examples=15, deadline=None)
@given(st.integers(0, 2**32 - 1), st.floats(1e-4, 10.0))
def test_place_attitude_and_size_do_not_matter(seed: int, scale: float) -> None:
    turn, shift = Rotation.random(rng=np.random.default_rng(seed)).as_matrix(), np.array([3.0, -7, 1])
    mask = np.random.default_rng(2).random((6, 7, 12)) < 0.6
    stations = np.array([[2.0, 3, 1], [3, 3, 5], [2, 3, 9]])
    expected = mask_areas(mask, MM, stations, one_line(stations))
    grid = VoxelGrid(scale * shift, np.full(3, scale), turn)
    found = mask_areas(mask, grid, scale * (stations @ turn.T + shift), one_line(stations))
    np.testing.assert_allclose(found.area, scale**2 * expected.area, rtol=1e-6)


def test_oblong_voxels() -> None:
    """Half as many layers of double thickness hold the same volume."""
    grid = VoxelGrid(np.array([0, 0, 0.5]), np.array([1.0, 1, 2]), np.eye(3))
    found = mask_areas(np.ones((4, 4, 5), bool), grid, DUCT, one_line(DUCT))
    np.testing.assert_allclose(found.area, 16)


def test_nothing_inside() -> None:
    found = mask_areas(np.zeros((4, 4, 4), bool), MM, DUCT, one_line(DUCT))
    assert found.empty.all()
    assert found.unassigned_volume == 0
    assert len(mask_areas(np.ones((2, 2, 2), bool), MM, np.empty((0, 3)), np.array([0])).area) == 0


def test_bad_input_gets_one_line() -> None:
    mask = np.ones((4, 4, 10), bool)
    with pytest.raises(InputError, match=r"mask: shape .* of uint8; three axes of true and false"):
        mask_areas(mask.astype(np.uint8), MM, DUCT, one_line(DUCT))
    with pytest.raises(InputError, match="stations 1 and 2 lie at one place: drop one"):
        mask_areas(mask, MM, DUCT[[0, 1, 1]], one_line(DUCT))
    with pytest.raises(InputError, match="a line has two stations or more"):
        mask_areas(mask, MM, DUCT, np.array([0, 1, 3]))
    with pytest.raises(InputError, match="rows of three finite numbers"):
        mask_areas(mask, MM, DUCT * np.nan, one_line(DUCT))
    with pytest.raises(InputError, match=r"radius: shape \(2,\) for 3 stations"):
        mask_areas(mask, MM, DUCT, one_line(DUCT), np.ones(2))
    with pytest.raises(InputError, match=r"spacing of the voxels \[1\.0, 0\.0, 1\.0\]: it must be above zero"):
        VoxelGrid(np.zeros(3), np.array([1, 0, 1]), np.eye(3))
    with pytest.raises(InputError, match="no unit vectors square to one another"):
        VoxelGrid(np.zeros(3), np.ones(3), np.ones((3, 3)))
    with pytest.raises(InputError, match=r"origin of the voxels \[0\.0, 0\.0\]: finite numbers"):
        VoxelGrid(np.zeros(2), np.ones(3), np.eye(3))


def test_every_voxel_goes_to_its_nearest_station() -> None:
    """On a straight line without spreading, the shares are those of the nearest stations, in the mean."""
    rng = np.random.default_rng(9)
    mask = rng.random((8, 8, 64)) < 0.5
    z = np.linspace(0, 63, 22)
    stations = np.stack((0 * z + 3.5, 0 * z + 3.5, z), axis=1)
    found = mask_areas(mask, MM, stations, one_line(stations))
    nearest = np.bincount(cKDTree(stations).query(np.argwhere(mask))[1], minlength=22)
    np.testing.assert_allclose(found.volume[1:-1], nearest[1:-1], atol=1e-9)  # borders lie between layers


def test_equal_radii_whose_squares_round_differently() -> None:
    """0.00134672841249616 squared alone and in an array differ in the last digit: no root of a negative number."""
    grid = VoxelGrid(np.zeros(3), np.full(3, 1e-3), np.eye(3))
    line = np.array([[1.5, 1.5, 2.0], [1.5, 1.5, 4.5], [1.5, 1.5, 7.0]]) * 1e-3
    mask = np.ones((4, 4, 10), bool)
    weighted = mask_areas(mask, grid, line, np.array([0, 3]), radius=np.full(3, 0.00134672841249616))
    assert weighted.area == pytest.approx(mask_areas(mask, grid, line, np.array([0, 3])).area)
