"""Vessels that only touch are parted; communicating vessels and forks are not."""

from __future__ import annotations

import numpy as np
import pytest

from geomprep.errors import InputError
from geomprep.model import degrees
from geomprep.repair import Given, Verdict, Verdicts, join
from geomprep.repair.kissing import KissingSettings, part_kissing
from geomprep.repair.parts import components

LONG = np.linspace(-20, 20, 81)[:, None]


def crossing(lines, angle: float = 70.0, radii=(1.0, 1.5), kind: int = 1):
    """Two straight vessels through one point, at an angle."""
    way = np.array([np.sin(np.radians(angle)), 0, np.cos(np.radians(angle))])
    return join(lines([LONG * [0, 0, 1.0], LONG * way], list(radii), classes=[kind, kind])).graph


def linked(lines, apart: float, own: float = 0.5):
    """Two straight vessels of radius 1 side by side, with a link between their middles."""
    link = np.linspace(0, apart, 5)[:, None] * [1.0, 0, 0]
    return join(lines([LONG * [0, 0, 1.0], LONG * [0, 0, 1.0] + [apart, 0, 0], link], [1.0, 1.0, own])).graph


def parted(graph, given: Given | None = None, **settings: float):
    return part_kissing(graph, KissingSettings(**settings), given or Given())


def parts(graph) -> int:
    return components(graph.n_points, graph.edges)[0]


def test_a_shared_point_becomes_two(lines) -> None:
    graph = crossing(lines)
    result = parted(graph)
    (repair,) = result.repairs
    assert (repair.choice, repair.options) == ("pairing A", ("leave", "pairing A", "pairing B"))
    assert (parts(graph), parts(result.graph)) == (1, 2)
    # each vessel keeps its own radius where the larger one stood before
    centre = np.linalg.norm(result.graph.points, axis=1) < 1e-9
    assert sorted(result.graph.radius[centre].tolist()) == pytest.approx([1.0, 1.5])
    assert result.graph.n_edges == graph.n_edges


def test_a_person_takes_the_other_pairing(lines) -> None:
    graph = crossing(lines)
    (repair,) = parted(graph).repairs
    other = parted(graph, Given(Verdicts({repair.id: Verdict("pairing B", "person")}))).graph
    assert parts(other) == 2
    count, label = components(other.n_points, other.edges)
    tips = np.flatnonzero(degrees(other.n_points, other.edges) == 1)
    top, left = other.points[tips, 2].argmax(), other.points[tips, 0].argmin()
    assert count == 2
    # straight on the upper tip leads to the lower one; turning by 70° it leads to the left, by 110° to the right
    assert label[tips[top]] == label[tips[left]]


def test_a_link_between_tubes_that_touch_is_cut(lines) -> None:
    graph = linked(lines, 2.4)  # 0.4 outside both tubes, less than 1.5 of its own radii
    result = parted(graph)
    (repair,) = result.repairs
    assert (repair.options, repair.conductance_after) == (("leave", "part"), 0.0)
    assert parts(result.graph) == 2
    assert (degrees(result.graph.n_points, result.graph.edges) <= 2).all()


def test_a_communicating_vessel_stays(lines) -> None:
    graph = linked(lines, 3.0)  # 1.0 outside both tubes, twice its own radius
    assert parted(graph).graph is graph


def test_ways_that_cannot_be_told_apart_stay(lines) -> None:
    """Vessels that cross at 8°: with equal radii either pairing may be right, with unlike ones it may not."""
    assert parted(crossing(lines, 8.0, (1.0, 1.0))).repairs == ()
    assert len(parted(crossing(lines, 8.0, (1.0, 1.6))).repairs) == 1


def test_a_fork_is_no_contact(lines) -> None:
    arms = [np.linspace(0, 20, 41)[:, None] * [np.sin(a), 0, np.cos(a)] for a in np.radians([-40.0, 0.0, 40.0])]
    graph = join(lines([np.linspace(-20, 0, 41)[:, None] * [0, 0, 1.0], *arms], [1.5, 1.0, 1.2, 1.0])).graph
    assert parted(graph).repairs == ()


def test_veins_are_asked(lines) -> None:
    (repair,) = parted(crossing(lines, kind=2)).repairs
    assert (repair.choice, repair.verdict_by) == ("leave", "open")


@pytest.mark.parametrize("settings", [{"straight_within": 70.0}, {"radius_ratio": 0.5}, {"link_outside": -1.0}])
def test_limits_out_of_range(settings: dict) -> None:
    with pytest.raises(InputError, match=r"repair\.kissing\."):
        KissingSettings(**settings)


@pytest.mark.parametrize("where", [0.0, 0.5, 1.0])
def test_a_link_with_a_name_is_a_vessel(lines, where: float) -> None:
    """A short communicating vessel looks like a false link; a name on it, or where it begins, says what it is."""
    from dataclasses import replace

    graph = linked(lines, 2.4)
    protected = np.zeros(graph.n_points, np.bool_)
    protected[np.argmin(np.linalg.norm(graph.points - [2.4 * where, 0, 0], axis=1))] = True
    assert parted(replace(graph, protected=protected)).repairs == ()
