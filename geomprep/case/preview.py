"""What would be repaired in a file, read in the most likely way, before there is a case."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from geomprep.errors import GeomprepError
from geomprep.files import FileContents
from geomprep.files.meaning import Gate, to_centrelines
from geomprep.files.statement import InputStatement
from geomprep.model import Centrelines, Repair
from geomprep.repair import Given, RadiusSettings, Verdicts, join, mend_graph, mend_radii

__all__ = ["Preview", "preview_repairs"]


@dataclass(frozen=True)
class Preview:
    """Repairs of a file under the settings that ship.

    Attributes
    ----------
    read_as : str
        How the numbers were read for this, or why there is nothing to show.
    repairs : tuple of Repair
        Done by a rule, or asked.
    """

    read_as: str
    repairs: tuple[Repair, ...] = ()


def preview_repairs(contents: FileContents, statement: InputStatement, checked: Gate | None) -> Preview:
    """Read a file in the most likely way and run every repair; nothing is kept.

    Parameters
    ----------
    contents : FileContents
    statement : InputStatement
        What is stated; the best reading stands in for the rest, and vessels not stated are of no known class.
    checked : Gate, optional
        Readings of the numbers.

    Returns
    -------
    Preview
    """
    if checked is None or not checked.hypotheses:
        return Preview("the sizes cannot be read")
    best = checked.hypotheses[0]
    likely = replace(
        statement,
        length_unit=best.unit,
        size_array=checked.likely.name,
        size_means=best.meaning,
        vessels=statement.vessels or "arteries",
    )
    vessels = statement.vessels or "vessels of no known class"
    read_as = f"{vessels}, '{checked.likely.name}' as {best.meaning} in {best.unit}"
    try:
        lines, _ = to_centrelines(contents, likely)
        if statement.vessels is None:
            lines = replace(lines, vessel_class=np.zeros(lines.n_lines, np.uint8))
        return Preview(read_as, _repairs(lines, max(statement.voxel or (0.0,)) or None))
    except GeomprepError as fault:
        return Preview(f"{read_as}: no repair can be tried ({fault})")


def _repairs(lines: Centrelines, voxel: float | None) -> tuple[Repair, ...]:
    """Repairs of radii, of joining and of every step."""
    mended = mend_radii(lines, RadiusSettings(), Verdicts())
    joined = join(mended.centrelines)
    return mend_graph(joined.graph, {}, Given(voxel=voxel), (*joined.repairs, *mended.repairs)).repairs
