"""Makers shared by the tests: small graphs and networks by hand."""

from collections.abc import Callable

import numpy as np
import numpy.typing as npt
import pytest

from geomprep.model import PointGraph

GraphMaker = Callable[..., PointGraph]


@pytest.fixture(scope="session")
def make_graph() -> GraphMaker:
    """Return a maker of point graphs whose raw points are the points themselves."""

    def make(
        points: npt.ArrayLike,
        edges: npt.ArrayLike,
        radius: npt.ArrayLike | float = 1.0,
        vessel_class: int = 1,
        own: list[tuple[int, int, float]] | None = None,
    ) -> PointGraph:
        points = np.asarray(points, dtype=float)
        n = len(points)
        rows = own or []
        return PointGraph(
            points=points,
            radius=np.broadcast_to(np.asarray(radius, dtype=float), n).copy(),
            radius_basis=np.zeros(n),
            vessel_class=np.full(n, vessel_class),
            input_id=np.zeros(n),
            protected=np.zeros(n, bool),
            source_point=np.arange(n),
            edges=np.asarray(edges).reshape(-1, 2),
            edge_basis=np.zeros(len(np.asarray(edges).reshape(-1, 2))),
            merged_into=np.arange(n),
            raw_points=points,
            own_radius_edge=[row[0] for row in rows],
            own_radius_end=[row[1] for row in rows],
            own_radius=[row[2] for row in rows],
        )

    return make
