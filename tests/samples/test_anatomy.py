"""The drawings are anatomy: sides, course, room between vessels, no folded tube."""

import itertools

import numpy as np
import pytest
from scipy.spatial import cKDTree

CLEAN = ["head-arteries", "limb", "neck-veins"]
NEAR_JUNCTION = 4.0  # in radii of the largest vessel at a junction: there siblings lie in one another


def pieces(load, name: str) -> list[tuple[str, np.ndarray, np.ndarray]]:
    """Name, points and own radius of every segment, in mm, from the lines of the file."""
    if name == "neck-veins":  # its file draws routes: cut them at the nodes, keep one of each piece
        return routes_cut(load(name))
    sample = load(name)
    factor = 10.0 if sample.truth["length_unit"] == "cm" else 1.0
    radius = factor * (sample.size / 2 if name == "limb" else sample.size)
    return [
        (segment["name"], factor * sample.points[line], radius[line])
        for segment, line in zip(sample.truth["segments"], sample.lines, strict=True)
    ]


def routes_cut(sample) -> list[tuple[str, np.ndarray, np.ndarray]]:
    node = {tuple(row["position"]): row["name"] for row in sample.truth["nodes"]}
    wanted = {frozenset((row["from"], row["to"])): row["name"] for row in sample.truth["segments"]}
    found = {}
    for line in sample.lines:
        stops = [number for number, place in enumerate(sample.points[line].tolist()) if tuple(place) in node]
        for first, last in itertools.pairwise(stops):
            part = line[first : last + 1]
            pair = frozenset(node[tuple(sample.points[end])] for end in (part[0], part[-1]))
            found[pair] = (wanted[pair], sample.points[part], sample.size[part])
    return list(found.values())


def junctions(parts) -> tuple[np.ndarray, np.ndarray]:
    """Places where vessels meet and the largest radius near each."""
    ends = np.array([points[end] for _, points, _ in parts for end in (0, -1)])
    radius = np.array([sizes[end] for _, _, sizes in parts for end in (0, -1)])
    places, index, count = np.unique(ends, axis=0, return_inverse=True, return_counts=True)
    largest = np.zeros(len(places))
    np.maximum.at(largest, index.ravel(), radius)
    return places[count > 1], largest[count > 1]


def overlaps(parts) -> list[tuple[str, str, list[float]]]:
    """Places where two different vessels are closer than the sum of their radii, junctions left out."""
    points = np.concatenate([points for _, points, _ in parts])
    radius = np.concatenate([radius for _, _, radius in parts])
    owner = np.repeat(np.arange(len(parts)), [len(points) for _, points, _ in parts])
    pairs = cKDTree(points).query_pairs(2 * radius.max(), output_type="ndarray")
    first, second = pairs[owner[pairs[:, 0]] != owner[pairs[:, 1]]].T
    touching = np.linalg.norm(points[first] - points[second], axis=1) < radius[first] + radius[second]
    first, second = first[touching], second[touching]
    places, largest = junctions(parts)
    if len(places):
        near = [
            np.linalg.norm(points[side][:, None] - places[None], axis=2) < NEAR_JUNCTION * largest
            for side in (first, second)
        ]
        free = ~(near[0] & near[1]).any(axis=1)
        first, second = first[free], second[free]
    return [(parts[owner[a]][0], parts[owner[b]][0], points[a].tolist()) for a, b in zip(first, second, strict=True)]


@pytest.mark.parametrize("name", CLEAN)
def test_vessels_leave_each_other_room(load, name: str) -> None:
    assert overlaps(pieces(load, name)) == []


def test_arteries_and_veins_of_the_head_leave_each_other_room(load) -> None:
    """The two samples of the head share one frame."""
    arteries, veins = pieces(load, "head-arteries"), pieces(load, "neck-veins")
    between = [hit for hit in overlaps(arteries + veins) if ("vein" in hit[0] + hit[1] or "sinus" in hit[0] + hit[1])]
    assert between == []


def test_the_check_of_room_can_fail(load) -> None:
    """A vessel shifted beside itself by one radius is found."""
    name, points, radius = pieces(load, "limb")[0]
    assert overlaps([(name, points, radius), ("shifted", points + np.array([0.0, radius.min(), 0.0]), radius)])


@pytest.mark.parametrize("name", CLEAN)
def test_no_tube_folds_into_itself(load, name: str) -> None:
    """The radius of curvature stays above the radius of the vessel (angle per step over step length)."""
    for vessel, points, radius in pieces(load, name):
        step = np.diff(points, axis=0)
        size = np.linalg.norm(step, axis=1)
        tangent = step / size[:, None]
        cosine = np.einsum("ij,ij->i", tangent[1:], tangent[:-1]).clip(-1, 1)
        curvature = np.arccos(cosine) / ((size[1:] + size[:-1]) / 2)
        assert (curvature * radius[1:-1]).max() < 0.9, vessel


@pytest.mark.parametrize("name", CLEAN)
def test_sides(load, name: str) -> None:
    """In LPS the left of the body has x > 0; mirrored drawings would fail here."""
    for vessel, points, _ in pieces(load, name):
        middle = points[len(points) // 2]
        if vessel.startswith("left"):
            assert middle[0] > 0, vessel
        if vessel.startswith("right"):
            assert middle[0] < 0, vessel


def test_course_of_the_head_vessels(load) -> None:
    """y grows to the back, z to the head: who lies before and above whom (textbook anatomy)."""
    middle = {
        vessel: points[len(points) // 2]
        for name in ("head-arteries", "neck-veins")
        for vessel, points, _ in pieces(load, name)
    }
    assert middle["left internal carotid artery"][1] < middle["left vertebral artery"][1]
    assert middle["left anterior cerebral artery A2"][1] < middle["basilar artery"][1]
    assert middle["basilar artery"][1] < middle["occipital sinus"][1]
    assert middle["left posterior cerebral artery P2"][1] > middle["left posterior cerebral artery P1"][1]
    assert abs(middle["left middle cerebral artery M2 superior"][0]) > abs(
        middle["left anterior cerebral artery A2"][0]
    )
    assert middle["superior sagittal sinus"][2] > middle["straight sinus"][2] > middle["occipital sinus"][2]
    assert middle["left sigmoid sinus"][2] > middle["left internal jugular vein"][2]
    assert abs(middle["basilar artery"][0]) < 2 and abs(middle["superior sagittal sinus"][0]) < 2


def test_course_of_the_arm_vessels(load) -> None:
    """Left arm, palm to the front: the radial artery is the outer one, the hand is below the elbow."""
    parts = {vessel: points for vessel, points, _ in pieces(load, "limb")}
    assert parts["left radial artery"][-1][0] > parts["left ulnar artery II"][-1][0]
    assert parts["left radial artery"][-1][2] < parts["left brachial artery"][-1][2]
    deep = parts["left deep brachial artery"]
    assert deep[len(deep) // 2][1] > parts["left brachial artery"][:, 1].max()  # winds behind the humerus
