"""Lines made by hand for the tests of joining."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

import networkx as nx
import numpy as np
import pytest

from geomprep.model import Centrelines, PointGraph

Maker = Callable[..., Centrelines]


def make_lines(
    lines: Sequence[Any], radius: Any = 1.0, classes: Sequence[int] | None = None, **more: Any
) -> Centrelines:
    """Poly-lines with private copies of all points; radius per line or per point of each line."""
    places = [np.asarray(line, float).reshape(-1, 3) for line in lines]
    sizes = [radius] * len(places) if np.isscalar(radius) else list(radius)
    flat = np.concatenate(places)
    values = np.concatenate(
        [np.broadcast_to(np.asarray(size, float), len(place)) for size, place in zip(sizes, places, strict=True)]
    )
    counts = [len(place) for place in places]
    return Centrelines(
        points=flat,
        radius=values,
        raw_points=flat,
        connectivity=np.arange(len(flat)),
        offsets=np.concatenate(([0], np.cumsum(counts))),
        vessel_class=classes if classes is not None else np.ones(len(places)),
        input_id=np.zeros(len(places)),
        radius_basis=np.zeros(len(flat)),
        **more,
    )


def as_multigraph(graph: PointGraph) -> nx.MultiGraph:
    """The point graph as networkx sees it."""
    whole = nx.MultiGraph()
    whole.add_nodes_from(range(graph.n_points))
    whole.add_edges_from(graph.edges.tolist())
    return whole


@pytest.fixture
def lines() -> Maker:
    """Make centrelines from lists of places."""
    return make_lines


@pytest.fixture
def multigraph() -> Callable[[PointGraph], nx.MultiGraph]:
    """Turn a point graph into a networkx multigraph."""
    return as_multigraph
