"""Look at a phantom: ``PYTHONPATH=tests python -m phantoms.pictures KIND SEED FILE.png``."""

from __future__ import annotations

import sys
from typing import Any

import numpy as np

from phantoms.truth import Truth

__all__ = ["draw_lines", "draw_truth"]

_COLOURS = {1: "#a33", 2: "#357", 0: "#777"}


def draw_truth(axes: Any, truth: Truth, across: tuple[int, int] = (0, 2)) -> None:
    """Draw the tubes as discs of their true size, seen along one axis."""
    from matplotlib.collections import EllipseCollection

    for segment in range(truth.n_segments):
        rows = truth.rows(segment)
        places, width = 1e3 * truth.points[rows][::4], 2e3 * truth.radius[rows][::4]
        colour = _COLOURS[int(truth.vessel_class[segment])]
        discs = EllipseCollection(
            width, width, 0 * width, units="xy", offsets=places[:, across], offset_transform=axes.transData
        )
        discs.set(facecolor=colour, edgecolor="none", alpha=0.25)
        axes.add_collection(discs)
        axes.plot(*places[:, across].T, color="black", linewidth=0.6)
    axes.plot(*1e3 * truth.nodes[truth.junctions][:, across].T, "k.", markersize=3)
    axes.set_aspect("equal")
    axes.autoscale_view()


def draw_lines(axes: Any, centrelines: Any, across: tuple[int, int] = (0, 2)) -> None:
    """Draw raw lines with their points."""
    points = 1e3 * np.asarray(centrelines.points)
    for a, b in zip(centrelines.offsets[:-1], centrelines.offsets[1:], strict=True):
        line = points[centrelines.connectivity[a:b]]
        axes.plot(*line[:, across].T, "-", linewidth=0.8, marker=".", markersize=2)
    axes.set_aspect("equal")


def main(kind: str, seed: str, file: str) -> None:
    """Draw one case from three sides, its raw lines below."""
    import matplotlib as mpl

    mpl.use("Agg")
    import matplotlib.pyplot as plt

    from phantoms.cases import cases

    case = next(cases(kind, int(seed), 1))
    figure, axes = plt.subplots(2, 3, figsize=(15, 10), dpi=110)
    for column, across in enumerate(((0, 2), (1, 2), (0, 1))):
        draw_truth(axes[0, column], case.truth, across)
        draw_lines(axes[1, column], case.centrelines, across)
        if case.spoiled is not None:
            for defect in case.spoiled.defects:
                if np.isfinite(defect.place).all():
                    place = [1e3 * defect.place[i] for i in across]
                    axes[1, column].annotate(defect.kind, place, fontsize=6, color="#c0f")
    figure.suptitle(f"{kind}, seed {seed} (mm)")
    figure.tight_layout()
    figure.savefig(file)


if __name__ == "__main__":
    main(*sys.argv[1:4])
