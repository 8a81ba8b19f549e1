"""What is doubtful about the walls, one finding per setting or literature row."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from typing import Final

import numpy as np

from geomprep.assign.wall_stiffness import WaveSpeeds
from geomprep.assign.wall_uses import WallUse
from geomprep.findings import Finding, Severity
from geomprep.literature import Row
from geomprep.model import BoolArray, FloatArray, Network, Walls
from geomprep.units import format_quantity, parse_quantity

__all__ = ["AREA_RATIO", "wall_findings"]

AREA_RATIO: Final = {"artery": (0.7, 1.3), "vein": (0.2, 1.2)}
"""A/A0 within which the laws are trusted; the judgement of the developers, no published limit is known."""

_MMHG = "mmHg"
_NEAR_STATE = parse_quantity("1 mmHg", "pressure")  # within it a pressure counts as the one a row holds at
_FAR_STATE = parse_quantity("20 mmHg", "pressure")  # beyond it the difference is worth a warning

Sources = Sequence[tuple[WallUse, WaveSpeeds]]


def wall_findings(network: Network, walls: Walls, sources: Sources) -> tuple[Finding, ...]:
    """List what a person should know about the walls.

    Parameters
    ----------
    network : Network
    walls : Walls
    sources : sequence of (WallUse, WaveSpeeds)
        Every setting with the wave speeds that it gave.

    Returns
    -------
    tuple of Finding
    """
    found: list[Finding] = []
    for source, mask in _rows_used(network, sources):
        found += _row_findings(network, walls, source, mask)
    found += [_default(use, speeds) for use, speeds in sources if speeds.by_default]
    for use, _ in sources:
        mask = _stations(network, use.segments)
        if use.vessel_class == "vein" and use.settings.reference_state == "imaged":
            found += _imaged_veins(use, walls.imaging_transmural[mask])
        found += _area_ratios(use, network.stations.area[mask] / walls.reference_area[mask])
    return tuple(found)


def _stations(network: Network, segments: BoolArray) -> BoolArray:
    """Mask of the stations of segments."""
    return np.repeat(segments, np.diff(network.stations.offsets))


def _rows_used(network: Network, sources: Sources) -> Iterator[tuple[Row, BoolArray]]:
    """Literature rows in use, each with all of its stations."""
    masks: dict[str, tuple[Row, BoolArray]] = {}
    for use, speeds in sources:
        if speeds.source is not None:
            here = _stations(network, use.segments)
            known = masks.get(speeds.source.key, (speeds.source, np.zeros_like(here)))[1]
            masks[speeds.source.key] = speeds.source, known | here
    yield from masks.values()


def _row_findings(network: Network, walls: Walls, source: Row, mask: BoolArray) -> Iterator[Finding]:
    """Findings about the use of one literature row."""
    if source.caution:
        yield Finding(
            "published value with a caution",
            Severity.WARNING,
            f"{source.key} ({source.of}) is used at {int(mask.sum())} stations: {source.caution}.",
            source=source.key,
        )
    yield from _outside(source, network.stations.radius[mask])
    if source.transmural_pressure is not None:
        yield from _other_pressure(source, source.transmural_pressure, walls.imaging_transmural[mask])


def _outside(source: Row, radius: FloatArray) -> Iterable[Finding]:
    """Radii outside the interval of a row."""
    low, high = source.radius_low, source.radius_high
    if low is None or high is None:
        return
    bad = (radius < low) | (radius > high)
    if bad.any():
        worst = radius[bad].min() if (radius < low).any() else radius[bad].max()
        yield Finding(
            "outside the range of a published relation",
            Severity.WARNING,
            f"{source.key} is used at {int(bad.sum())} of {len(radius)} stations outside its radii of "
            f"{format_quantity(low, 'mm')} to {format_quantity(high, 'mm')}: radii of "
            f"{format_quantity(radius[bad].min(), 'mm')} to {format_quantity(radius[bad].max(), 'mm')}.",
            value=float(worst),
            limit=low if worst < low else high,
            unit="m",
            source=source.key,
        )


def _other_pressure(source: Row, state: float, transmural: FloatArray) -> Iterable[Finding]:
    """A row that holds at another pressure than that of imaging."""
    away = np.abs(transmural - state)
    if away.max(initial=0.0) <= _NEAR_STATE:
        return
    worst = float(transmural[int(np.argmax(away))])
    far = float(away.max()) > _FAR_STATE
    yield Finding(
        "stiffness at another pressure",
        Severity.WARNING if far else Severity.NOTE,
        f"{source.key} holds at {format_quantity(state, _MMHG)}; it is used as it stands at transmural pressures of "
        f"{format_quantity(float(transmural.min()), _MMHG)} to {format_quantity(float(transmural.max()), _MMHG)}.",
        value=worst,
        limit=state,
        unit="Pa",
        source=source.key,
    )


def _default(use: WallUse, speeds: WaveSpeeds) -> Finding:
    """A class whose stiffness nobody stated."""
    return Finding(
        "stiffness by default",
        Severity.NOTE,
        f"[{use.key}] states no stiffness for {int(use.segments.sum())} segment(s); {speeds.detail} is used: wave "
        f"speeds of {speeds.speed.min():.3g} to {speeds.speed.max():.3g} m/s.",
        source=speeds.detail,
    )


def _imaged_veins(use: WallUse, transmural: FloatArray) -> Iterable[Finding]:
    """Veins whose law does not know where they collapse."""
    worst = float(transmural[int(np.argmax(np.abs(transmural)))])
    if worst != 0.0:
        yield Finding(
            "collapse point not modelled",
            Severity.WARNING,
            f"[{use.key}] takes the imaged state of veins as reference: the law is right near the image, but it lets "
            f"them collapse around {format_quantity(worst, _MMHG)} instead of 0.",
            value=worst,
            limit=0.0,
            unit="Pa",
        )


def _area_ratios(use: WallUse, ratio: FloatArray) -> Iterable[Finding]:
    """Imaged states far from the reference state."""
    low, high = AREA_RATIO[use.vessel_class]
    bad = (ratio < low) | (ratio > high)
    if bad.any():
        worst = float(ratio[bad].min() if ratio.min() < low else ratio.max())
        yield Finding(
            "far from the reference state",
            Severity.WARNING,
            f"[{use.key}]: at {int(bad.sum())} of {len(ratio)} stations the imaged area is {ratio.min():.3g} to "
            f"{ratio.max():.3g} times the reference area, outside the {low:g} to {high:g} within which the "
            f"{use.vessel_class} law is trusted; a faster wave speed would bring it nearer.",
            value=worst,
            limit=low if worst < low else high,
        )
