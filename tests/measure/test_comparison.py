"""Comparison of networks: changes made on purpose are found with the numbers that follow from them, others are not."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.ndimage import gaussian_filter1d

from geomprep.errors import InputError
from geomprep.measure.comparison import (
    Change,
    Comparison,
    ComparisonSettings,
    Vessels,
    compare_vessels,
    local_changes,
    shared_length,
)
from geomprep.model import Stations

MIRROR = {
    Change.NEW: Change.GONE,
    Change.LONGER: Change.SHORTER,
    Change.WIDER: Change.NARROWER,
    Change.SPLIT: Change.JOINED,
    Change.REROUTED: Change.REROUTED,
    Change.RENAMED: Change.RENAMED,
}
MIRROR |= {there: here for here, there in MIRROR.items()}


def line(start, end, radius, n=61, bow=0.0):
    """Stations on a bowed way between two places, radius a number or a function of the part of the way; all in mm."""
    part = np.linspace(0, 1, n)
    start, end = np.array(start, float), np.array(end, float)
    points = start + part[:, None] * (end - start) + bow * np.sin(np.pi * part)[:, None] * np.array([0, 0, 1.0])
    return points * 1e-3, (radius(part) if callable(radius) else np.full(n, float(radius))) * 1e-3


def vessels(lines, ends, names=None, classes=None):
    """Vessels of lines, with the nodes at which they start and end."""
    along = [np.concatenate(([0], np.cumsum(np.linalg.norm(np.diff(p, axis=0), axis=1)))) for p, _ in lines]
    stations = Stations(
        offsets=np.cumsum([0, *(len(p) for p, _ in lines)]),
        distance=np.concatenate(along),
        position=np.concatenate([p for p, _ in lines]),
        radius=np.concatenate([r for _, r in lines]),
        basis=np.zeros(sum(len(p) for p, _ in lines)),
    )
    ends = np.array(ends)
    return Vessels(
        stations,
        ends[:, 0],
        ends[:, 1],
        np.array(names or [""] * len(lines), dtype=object),
        np.array(classes or [1] * len(lines), dtype=np.uint8),
    )


TRUNK = line((0, 0, 0), (60, 0, 0), 3, bow=8)
LEFT = line((60, 0, 0), (90, 30, 0), 2)
RIGHT = line((60, 0, 0), (90, -30, 0), 1.5)
ENDS = [(0, 1), (1, 2), (1, 3)]
Y = vessels([TRUNK, LEFT, RIGHT], ENDS)


def said(found: Comparison) -> list[set[str]]:
    """Changes of each group that has any."""
    return [{kind.name for kind in Change if row[kind]} for row in found.changes if row.any()]


def test_a_network_does_not_differ_from_itself() -> None:
    found = compare_vessels(Y, Y)
    assert said(found) == []
    assert len(found) == 3
    assert shared_length(found) == 1
    assert found.length[:, 0] == pytest.approx(found.length[:, 1], rel=1e-15)
    assert found.local == pytest.approx(np.zeros((3, 2)), abs=1e-12)


def test_direction_and_order_of_segments_do_not_matter() -> None:
    turned = [(points[::-1], radius[::-1]) for points, radius in (RIGHT, TRUNK, LEFT)]
    assert said(compare_vessels(Y, vessels(turned, [(3, 1), (1, 0), (2, 1)]))) == []


def test_new_and_gone() -> None:
    found = compare_vessels(Y, vessels([TRUNK, LEFT], ENDS[:2]))
    assert said(found) == [{"GONE"}]
    group = found.group[0][2]
    assert found.length[group] == pytest.approx([30e-3 * math.sqrt(2), 0])
    assert found.radius[group, 0] == pytest.approx(1.5e-3)
    assert np.isnan(found.radius[group, 1])
    assert found.place[group] == pytest.approx([75e-3, -15e-3, 0], abs=1e-3)  # the middle of what is gone
    assert said(compare_vessels(vessels([TRUNK, LEFT], ENDS[:2]), Y)) == [{"NEW"}]


def test_narrowing_has_the_resistance_that_follows_from_it() -> None:
    """r halved over the middle third of a straight tube: ∫ds/r⁴ is (2/3 + 16/3) = 6 times as large.

    The radius of equal resistance falls by 6^(−1/4) = 0.639; the least local ratio is 1/2, in the middle. Ramps of one
    station pitch (1/60 of the length) at both ends of the narrowed third add (∫ over a ramp from r to r/2 is
    h(1 + 1/2 + 1/4)/(3/8) = 14/3 h each), the narrowed stretch loses one pitch in all.
    """

    def radius(part):
        return np.where((part > 0.34) & (part < 0.66), 1.0, 2.0)

    straight = [line((0, 0, 0), (60, 0, 0), 2), line((0, 0, 0), (60, 0, 0), radius)]
    found = compare_vessels(*(vessels([each], [(0, 1)]) for each in straight))
    assert said(found) == [{"NARROWER"}]
    narrow = np.flatnonzero(radius(np.linspace(0, 1, 61)) == 1)
    at_half, ramps, wide = len(narrow) - 1, 2, 60 - (len(narrow) - 1) - 2
    factor = (wide + 16 * at_half + ramps * 14 / 3) / 60
    assert factor == pytest.approx(6, rel=0.07)  # what sampling makes of it
    assert found.inverse_fourth_power[0, 1] / found.inverse_fourth_power[0, 0] == pytest.approx(factor, rel=1e-12)
    assert found.radius[0, 1] / found.radius[0, 0] == pytest.approx(factor**-0.25, rel=1e-9)
    assert np.exp(found.local[0]) == pytest.approx([0.5, 1.0], rel=1e-9)
    assert 20e-3 < found.place[0, 0] < 40e-3


def test_focal_widening_is_seen_though_resistance_hardly_moves() -> None:
    """A bulge to twice the radius over a sixth of the length lowers ∫ds/r⁴ by less than 1/6."""

    def bulge(part):
        return 2 * (1 + np.exp(-(((part - 0.5) / 0.06) ** 2)))

    found = compare_vessels(
        vessels([line((0, 0, 0), (60, 0, 0), 2)], [(0, 1)]), vessels([line((0, 0, 0), (60, 0, 0), bulge)], [(0, 1)])
    )
    assert said(found) == [{"WIDER"}]
    assert 1 > found.inverse_fourth_power[0, 1] / found.inverse_fourth_power[0, 0] > 5 / 6
    assert np.exp(found.local[0, 1]) == pytest.approx(2, rel=0.1)
    assert found.place[0, 0] == pytest.approx(30e-3, abs=1.1e-3)  # to one cell of half a radius


def test_longer_where_an_open_end_reaches_further() -> None:
    longer = line((60, 0, 0), (100, 40, 0), 2)
    found = compare_vessels(Y, vessels([TRUNK, longer, RIGHT], ENDS))
    assert said(found) == [{"LONGER"}]
    group = found.group[0][1]
    assert found.length[group] == pytest.approx([30e-3 * math.sqrt(2), 40e-3 * math.sqrt(2)])
    # the part that both have is compared in radius, the end that is new is not; reach is half a radius beyond the end
    assert found.shared[group, 1] == pytest.approx(found.length[group, 0], abs=0.5 * 2e-3 + 1e-3)
    assert found.radius[group] == pytest.approx([2e-3, 2e-3])


@pytest.mark.parametrize(("step", "expected"), [(1.5, []), (2.5, [{"LONGER"}])])
def test_an_end_that_shifts_by_less_than_a_radius_is_no_change(step: float, expected: list) -> None:
    """Radius 2 mm, length 30 mm: one radius is more than 5 % of the length, so it is the limit."""
    pair = [vessels([line((0, 0, 0), (end, 0, 0), 2)], [(0, 1)]) for end in (30, 30 + step)]
    assert said(compare_vessels(*pair)) == expected


def test_split_by_a_new_branch() -> None:
    """The trunk cut in two where a branch leaves: split, nothing lost; and the branch is new."""
    points, radius = TRUNK
    near, far = (points[:31], radius[:31]), (points[30:], radius[30:])
    branch = line(points[30] * 1e3, points[30] * 1e3 + (0, 0, 25), 1)
    after = vessels([near, far, LEFT, RIGHT, branch], [(0, 1), (1, 2), (2, 3), (2, 4), (1, 5)])
    found = compare_vessels(Y, after)
    assert sorted(map(sorted, said(found))) == [["NEW"], ["SPLIT"]]
    group = found.group[0][0]
    assert found.group[1][:2].tolist() == [group, group]
    assert found.length[group, 1] == pytest.approx(found.length[group, 0], rel=1e-12)
    assert found.inverse_fourth_power[group, 1] == pytest.approx(found.inverse_fourth_power[group, 0], rel=1e-9)
    assert sorted(map(sorted, said(compare_vessels(after, Y)))) == [["GONE"], ["JOINED"]]


@pytest.mark.parametrize(
    ("ends", "is_line"),
    [
        ([(0, 1), (1, 2), (2, 3)], True),
        ([(0, 1), (2, 1), (2, 3)], True),
        ([(0, 1), (1, 2), (1, 3)], False),  # all three at one node
        ([(0, 1), (1, 2), (4, 3)], False),  # two parts
        ([(0, 1), (1, 0), (2, 3)], False),  # a ring and a piece
    ],
)
def test_one_resistance_only_where_segments_form_a_line(ends: list, is_line: bool) -> None:
    whole = vessels([line((0, 0, 0), (60, 0, 0), 3)], [(0, 1)])
    pieces = [line((x, 0, 0), (x + 20, 0, 0), 3) for x in (0, 20, 40)]
    found = compare_vessels(whole, vessels(pieces, ends))
    assert said(found) == [{"SPLIT"}]
    assert found.inverse_fourth_power[0, 0] == pytest.approx(60e-3 / 3e-3**4)
    expected = 60e-3 / 3e-3**4 if is_line else math.nan
    assert found.inverse_fourth_power[0, 1] == pytest.approx(expected, nan_ok=True)


def test_rerouted() -> None:
    """The middle 40 % run 12 mm aside: as much is left as is new, and it is one vessel still."""

    def way(aside):
        part = np.linspace(0, 1, 241)
        side = aside * np.clip(np.minimum((part - 0.3) / 0.02, (0.7 - part) / 0.02), 0, 1)
        return np.column_stack((80e-3 * part, 1e-3 * side, 0 * part)), np.full(241, 2e-3)

    found = compare_vessels(vessels([way(0)], [(0, 1)]), vessels([way(12)], [(0, 1)]))
    assert "REROUTED" in said(found)[0]
    assert found.shared[0, 0] == pytest.approx(48e-3, rel=0.05)


def test_names() -> None:
    first, same, other, half = (
        vessels([TRUNK, LEFT, RIGHT], ENDS, names)
        for names in (["a", "b", "c"], ["a", "b", "c"], ["a", "c", "b"], ["a", "", "c"])
    )
    assert said(compare_vessels(first, same)) == said(compare_vessels(first, half)) == []
    assert said(compare_vessels(first, other)) == [{"RENAMED"}, {"RENAMED"}]
    # 0.8 radii aside: one vessel only where the name says so
    near, aside = line((0, 0, 0), (60, 0, 0), 2), line((0, 1.6, 0), (60, 1.6, 0), 2)
    apart = [{"NEW"}, {"GONE"}]
    for names, expected in ((("a", "a"), []), (("a", "b"), apart), (("", ""), apart)):
        pair = (vessels([each], [(0, 1)], [name]) for each, name in zip((near, aside), names, strict=True))
        assert sorted(map(sorted, said(compare_vessels(*pair)))) == sorted(map(sorted, expected))


@pytest.mark.parametrize(("classes", "same"), [((1, 2), False), ((1, 1), True), ((0, 2), True)])
def test_an_artery_never_answers_to_a_vein(classes: tuple[int, int], same: bool) -> None:
    pair = (vessels([TRUNK], [(0, 1)], classes=[one]) for one in classes)
    assert (said(compare_vessels(*pair)) == []) is same


def test_neighbours_are_not_confused() -> None:
    """Two vessels side by side, one radius between their walls; the left one is gone, the right one is as it was."""
    pair = [line((0, 0, 0), (60, 0, 0), 2), line((0, 5, 0), (60, 5, 0), 2)]
    found = compare_vessels(vessels(pair, [(0, 1), (2, 3)]), vessels(pair[1:], [(0, 1)]))
    assert said(found) == [{"GONE"}]
    assert not found.changes[found.group[0][1]].any()


def test_changes_within_the_stated_noise_do_not_count() -> None:
    """A radius of 2 mm wider by 8 %, 0.16 mm: two readings scatter by √2 σ, and two of those are 0.16 mm at σ = 57 µm."""
    pair = [vessels([line((0, 0, 0), (60, 0, 0), radius)], [(0, 1)]) for radius in (2.0, 2.16)]
    limit = math.log(1.08) * 2.08e-3 / (2 * math.sqrt(2))
    assert said(compare_vessels(*pair)) == [{"WIDER"}]
    assert said(compare_vessels(*pair, ComparisonSettings(radius_deviation=1.01 * limit))) == []
    assert said(compare_vessels(*pair, ComparisonSettings(radius_deviation=0.99 * limit))) == [{"WIDER"}]
    assert said(compare_vessels(*pair, ComparisonSettings(voxel=1.01 * limit / 0.25))) == []


def test_noise_of_the_stated_size_is_mostly_quiet() -> None:
    """Radii and positions of both readings scatter independently at every station; nothing is said of 60 vessels."""
    random = np.random.default_rng(11)
    lines = [line((0, 20 * k, 0), (50, 20 * k, 0), 2, bow=5) for k in range(60)]

    def reading():
        return vessels(
            [(p + random.normal(0, 1e-4, p.shape), r + random.normal(0, 1e-4, r.shape)) for p, r in lines],
            [(2 * k, 2 * k + 1) for k in range(60)],
        )

    assert said(compare_vessels(reading(), reading(), ComparisonSettings(voxel=0.4e-3))) == []


def test_long_vessels_do_not_raise_more_alarms_than_stated() -> None:
    """Noise of the stated size, correlated along the vessel so that averaging does not help, on 150 long vessels.

    Two standard deviations are passed by chance in 2 Φ(−2) = 4.6 % of vessels as a whole, and in 4.6 % at most
    somewhere: 9.1 % together, 13.7 of 150, and three standard deviations of that count (√(150 · 0.091 · 0.909) = 3.5) more.
    """
    random = np.random.default_rng(4)
    lines = [line((0, 20 * k, 0), (200, 20 * k, 0), 2, n=201) for k in range(150)]

    def reading():
        noise = gaussian_filter1d(random.normal(size=(150, 201)), 4, axis=1, mode="wrap")
        noise *= 2e-4 / noise.std()
        return vessels(
            [(p, r + own) for (p, r), own in zip(lines, noise, strict=True)], [(2 * k, 2 * k + 1) for k in range(150)]
        )

    found = compare_vessels(reading(), reading(), ComparisonSettings(voxel=0.8e-3))
    assert len(said(found)) <= 13.7 + 3 * 3.5

    # narrowing one place in twenty to half is still seen: ln 2 = 0.69 against 3.25 √2 · 0.2/1.5 = 0.61
    def pinched(part):
        return np.where(np.abs(part - 0.5) < 0.04, 1.0, 2.0)

    pair = [vessels([line((0, 0, 0), (200, 0, 0), r, n=201)], [(0, 1)]) for r in (2, pinched)]
    assert said(compare_vessels(*pair, ComparisonSettings(voxel=0.8e-3))) == [{"NARROWER"}]


def spoiled(random: np.random.Generator) -> Vessels:
    """The Y with a random change of every kind, its nodes and order shuffled."""
    lines, ends = [], []
    for (points, radius), pair in zip((TRUNK, LEFT, RIGHT), ENDS, strict=True):
        if random.random() < 0.2:
            continue
        factor = random.uniform(0.4, 1.8) if random.random() < 0.5 else 1.0
        kept = len(points) - (random.integers(0, 30) if pair[0] == 1 else 0)
        lines.append((points[:kept] + random.normal(0, 1e-4, (kept, 3)), factor * radius[:kept]))
        ends.append(pair)
    lines.append(line((30, 0, 8), (30 + random.uniform(-20, 20), 0, 40), 1))
    ends.append((7, 8))
    order = random.permutation(len(lines))
    return vessels([lines[row] for row in order], [ends[row] for row in order])


@settings(max_examples=40, deadline=None)
@given(st.integers(0, 2**32 - 1))
def test_swapping_the_networks_mirrors_the_answer(seed: int) -> None:
    random = np.random.default_rng(seed)
    one, two = spoiled(random), spoiled(random)
    forth, back = compare_vessels(one, two), compare_vessels(two, one)
    assert len(forth) == len(back)
    # groups are numbered by their lowest segment, which swapping changes: go by the segments
    group = np.full(len(forth), -1)
    group[forth.group[0]], group[forth.group[1]] = back.group[1], back.group[0]
    for kind in Change:
        np.testing.assert_array_equal(forth.changes[:, kind], back.changes[group, MIRROR[kind]])
    for name in ("length", "shared", "radius", "inverse_fourth_power"):
        np.testing.assert_array_equal(getattr(forth, name), getattr(back, name)[group, ::-1])
    np.testing.assert_allclose(forth.local, -back.local[group, ::-1], rtol=1e-12)


@settings(max_examples=20, deadline=None)
@given(st.integers(0, 2**32 - 1))
def test_moving_and_scaling_both_changes_nothing(seed: int) -> None:
    """Everything is in parts of the radius: a rigid motion and a scale of both networks leave the answer as it is."""
    random = np.random.default_rng(seed)
    one, two = spoiled(random), spoiled(random)
    rotation = np.linalg.qr(random.normal(size=(3, 3)))[0]
    rotation *= np.linalg.det(rotation)
    scale, shift = 2.0 ** random.integers(-3, 4), random.normal(0, 0.1, 3)

    def moved(each: Vessels) -> Vessels:
        s = each.stations
        stations = Stations(
            s.offsets, s.distance * scale, s.position @ rotation.T * scale + shift, s.radius * scale, s.basis
        )
        return Vessels(stations, each.from_node, each.to_node, each.name, each.vessel_class)

    still, after = compare_vessels(one, two), compare_vessels(moved(one), moved(two))
    np.testing.assert_array_equal(still.changes, after.changes)
    np.testing.assert_allclose(after.length, still.length * scale, rtol=1e-9)
    np.testing.assert_allclose(after.local, still.local, atol=1e-6)


def test_local_changes_are_averaged_over_five_cells_of_one_segment() -> None:
    """ln 2 at one cell of five is ln 2/5 in its window, and is not seen from the next segment."""
    from geomprep.measure.alongside import Nearest, cells

    cut = cells(vessels([TRUNK, LEFT], ENDS[:2]).stations, 0.5)
    last = cut.first[1] - 1
    radius = cut.radius.copy()
    radius[last] *= 2
    found = local_changes(cut, Nearest(cut.segment, radius))
    # at the last cell the window holds three: itself and two before
    assert found[last - 3 : last + 2] == pytest.approx(math.log(2) * np.array([0, 1 / 5, 1 / 4, 1 / 3, 0]), abs=1e-12)


@pytest.mark.parametrize(("name", "value"), [("within", 0.0), ("share", 1.5), ("angle", 2.0), ("voxel", float("nan"))])
def test_settings_out_of_range_are_refused(name: str, value: float) -> None:
    with pytest.raises(InputError, match=f"{name} = "):
        ComparisonSettings(**{name: value})
