"""The truth of each sample agrees with its file, read with plain Python."""

import csv
from collections import Counter
from itertools import pairwise

import networkx as nx
import numpy as np
import pytest

# Typed by hand from the plan of each phantom: nodes, segments, components, loops, open ends
COUNTS = {
    "limb": (8, 7, 1, 0, 5),
    "head-arteries": (26, 25, 1, 0, 14),
    "neck-veins": (20, 21, 1, 2, 10),
}
CLEAN = sorted(COUNTS)


def chains_of(sample) -> nx.MultiGraph:
    """Graph of junctions and ends from the coordinates alone, runs between them contracted to one edge each."""
    graph = nx.Graph()
    for line in sample.lines:
        places = [tuple(place) for place in sample.points[line].tolist()]
        graph.add_edges_from(pairwise(places))
    ends = {place for place, degree in graph.degree if degree != 2}
    contracted = nx.MultiGraph()
    done = set()
    for start in sorted(ends):
        for step in graph[start]:
            path = [start, step]
            while path[-1] not in ends:
                path.append(next(place for place in graph[path[-1]] if place != path[-2]))
            if frozenset((path[0], path[1])) not in done:
                done.update((frozenset(path[:2]), frozenset(path[-2:])))
                contracted.add_edge(path[0], path[-1], points=np.array(path))
    return contracted


@pytest.mark.parametrize("name", CLEAN)
def test_counts(load, name: str) -> None:
    sample = load(name)
    graph = chains_of(sample)
    components = nx.number_connected_components(graph)
    found = (
        graph.number_of_nodes(),
        graph.number_of_edges(),
        components,
        graph.number_of_edges() - graph.number_of_nodes() + components,
        sum(degree == 1 for _, degree in graph.degree),
    )
    assert found == COUNTS[name]
    assert tuple(sample.truth["counts"].values()) == COUNTS[name]
    assert (len(sample.points), len(sample.lines)) == (sample.truth["points"], sample.truth["lines"])


@pytest.mark.parametrize("name", CLEAN)
def test_segments(load, name: str) -> None:
    """Every segment of the truth is a run of the file between the nodes named, of the length stated."""
    sample = load(name)
    graph = chains_of(sample)
    place = {node["name"]: tuple(node["position"]) for node in sample.truth["nodes"]}
    for segment in sample.truth["segments"]:
        (run,) = graph[place[segment["from"]]][place[segment["to"]]].values()
        drawn = np.linalg.norm(np.diff(run["points"], axis=0), axis=1)
        assert drawn.sum() == pytest.approx(segment["drawn_length"], abs=2e-5)
        # an inscribed poly-line is shorter than its curve; rounding the places may add a little
        assert 0.997 * segment["length"] < drawn.sum() < 1.00002 * segment["length"]
        spacing = drawn * (10 if sample.truth["length_unit"] == "cm" else 1)
        assert spacing.min() > 0.45  # mm
        assert spacing.max() < 1.05


@pytest.mark.parametrize("name", CLEAN)
def test_radii(load, name: str) -> None:
    """Radii are positive, and the truth's radii stand in the file one point from each node and at the ends."""
    sample = load(name)
    radius = sample.size / 2 if name == "limb" else sample.size
    assert (radius > 0).all()
    known = {tuple(place): value for place, value in zip(sample.points.tolist(), radius.tolist(), strict=True)}
    degree = Counter(end for s in sample.truth["segments"] for end in (s["from"], s["to"]))
    place = {node["name"]: tuple(node["position"]) for node in sample.truth["nodes"]}
    for segment in sample.truth["segments"]:
        for end, own in ((segment["from"], segment["radius_at_from"]), (segment["to"], segment["radius_at_to"])):
            if degree[end] == 1:
                assert known[place[end]] == pytest.approx(own, abs=1e-12)
    smallest = min(segment["minimum_radius"] for segment in sample.truth["segments"])
    assert radius.min() == pytest.approx(smallest, abs=1e-12)


def test_private_copies_carry_their_own_radius(load) -> None:
    head = load("head-arteries")
    for segment, line in zip(head.truth["segments"], head.lines, strict=True):
        assert head.size[line[0]] == segment["radius_at_from"]
        assert head.size[line[-1]] == segment["radius_at_to"]
    assert len(head.points) == sum(map(len, head.lines))


def test_habits(load) -> None:
    limb, veins = load("limb"), load("neck-veins")
    assert len(np.unique(limb.points, axis=0)) == len(limb.points)  # shared points: no place twice
    shared = Counter(number for line in limb.lines for number in line.tolist())
    assert sum(count - 1 for count in shared.values()) == 2 * 7 - 8  # ends of 7 segments at 8 nodes
    rows = np.column_stack((veins.points, veins.size))
    distinct = np.unique(rows, axis=0)
    assert len(distinct) == len(np.unique(veins.points, axis=0))  # repeated trunks agree in radius
    assert len(distinct) < 0.6 * len(rows)
    ends = {node["name"]: tuple(node["position"]) for node in veins.truth["nodes"]}
    starts = {name for name, place in ends.items() if place in {tuple(veins.points[line[0]]) for line in veins.lines}}
    assert starts == {name for name in ends if name.endswith("start")}


@pytest.mark.parametrize("name", [*CLEAN, "neck-veins-rough"])
def test_names(load, samples_folder, name: str) -> None:
    """Each name lies on a point of its own segment (of the clean geometry)."""
    clean = load(name.removesuffix("-rough"))
    graph = chains_of(clean)
    place = {node["name"]: tuple(node["position"]) for node in clean.truth["nodes"]}
    with (samples_folder / name / "names.csv").open(newline="") as file:
        rows = list(csv.DictReader(file))
    assert [row["name"] for row in rows] == [segment["name"] for segment in clean.truth["segments"]]
    for row, segment in zip(rows, clean.truth["segments"], strict=True):
        (run,) = graph[place[segment["from"]]][place[segment["to"]]].values()
        at = np.array([row["x"], row["y"], row["z"]], dtype=float)
        assert (np.abs(run["points"] - at).max(axis=1) == 0).any()
