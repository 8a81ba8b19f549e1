"""Two networks against one another: before and after, two readers, two dates."""

from __future__ import annotations

import os
from dataclasses import dataclass, replace
from typing import Any, Final

import numpy as np

from geomprep.case.compare_findings import below_limits, comparison_findings
from geomprep.case.compare_routes import EndPair, RouteChange, effects, matched_ends, route_changes
from geomprep.case.network_reading import ReadNetwork, read_network
from geomprep.errors import InputError
from geomprep.export.texts import CAUTIONS
from geomprep.findings import Finding
from geomprep.measure.alongside import cells
from geomprep.measure.comparison import Change, Comparison, ComparisonSettings, Vessels, compare_vessels
from geomprep.measure.rigid_fit import RigidFit, rigid_fit
from geomprep.measure.route_resistance import route_resistance

__all__ = ["COMPARISON_CAUTIONS", "NetworkComparison", "VesselChange", "compare"]

COMPARISON_CAUTIONS: Final = (
    *CAUTIONS,
    "A difference between two networks may come from the image, the reader, the settings or the posture; "
    "it does not show that a vessel has changed.",
    "Effects on resistance are those of the model's geometry alone; they do not predict what a treatment does.",
)
"""What must not be concluded from a comparison."""


@dataclass(frozen=True)
class VesselChange:
    """One vessel in both networks; numbers are pairs (first, second), None where a network has none of it.

    Attributes
    ----------
    name : str
        Name of the vessel, or the id of its first segment.
    changes : tuple of str
        Words of :class:`geomprep.measure.comparison.Change`; empty where nothing differs.
    segments : tuple of two tuples of str
        Ids in both networks.
    length, shared : tuple of float
        Length, and how much of it runs along the other network, m.
    radius : tuple of float
        Radius of equal resistance over the shared length, or over all of it where new or gone, m.
    resistance : tuple of float
        Pa·s/m³ from end to end; None where the segments form no single line.
    local_ratio : tuple of float
        Least and largest ratio of the second radius to the first along the shared length.
    effect : float
        What this change alone does to the resistance from inlets to outlets, Pa·s/m³: mean of making it in
        the first network and of taking it back in the second; None where it closes the only way, or was not computed.
    effect_part : float
        The same over the resistance of the first network.
    place : tuple of float
        Where the radius differs most, or the middle of the vessel, m in the frame of the first network.
    """

    name: str
    changes: tuple[str, ...]
    segments: tuple[tuple[str, ...], tuple[str, ...]]
    length: tuple[float | None, float | None]
    shared: tuple[float | None, float | None]
    radius: tuple[float | None, float | None]
    resistance: tuple[float | None, float | None]
    local_ratio: tuple[float | None, float | None]
    effect: float | None
    effect_part: float | None
    place: tuple[float, float, float]


@dataclass(frozen=True, eq=False)
class NetworkComparison:
    """The answer of a comparison.

    Attributes
    ----------
    files : tuple of str
    fit : RigidFit, optional
        Motion that laid the second network upon the first; None where none was asked for.
    vessels : tuple of VesselChange
        Those that differ first, the largest effect first.
    total : tuple of float
        Resistance from all inlets to all outlets, Pa·s/m³; None where nothing joins them.
    routes : tuple of RouteChange
        The same between single inlets and outlets that both networks have.
    ends : tuple of EndPair
        Inlets and outlets of both.
    shared_part : float
        Part of the length of both networks that runs along the other.
    settings : ComparisonSettings
    findings : tuple of Finding
    cautions : tuple of str
    """

    files: tuple[str, str]
    fit: RigidFit | None
    vessels: tuple[VesselChange, ...]
    total: tuple[float | None, float | None]
    routes: tuple[RouteChange, ...]
    ends: tuple[EndPair, ...]
    shared_part: float
    settings: ComparisonSettings
    findings: tuple[Finding, ...]
    cautions: tuple[str, ...] = COMPARISON_CAUTIONS

    @property
    def changed(self) -> tuple[VesselChange, ...]:
        """Vessels that differ."""
        return tuple(vessel for vessel in self.vessels if vessel.changes)

    def to_dict(self) -> dict[str, Any]:
        """Everything as plain numbers, texts, lists and dicts, SI, ready for JSON."""
        fit = self.fit and {
            "rotation": self.fit.rotation.tolist(),
            "shift": self.fit.shift.tolist(),
            "angle": self.fit.angle,
            "distance": self.fit.distance,
        }
        return {
            "files": list(self.files),
            "fit": fit,
            "shared_part": self.shared_part,
            "vessels": [vars(vessel) for vessel in self.vessels],
            "resistance": {"all_inlets_to_all_outlets": self.total, "routes": [vars(route) for route in self.routes]},
            "ends": [vars(end) for end in self.ends],
            "settings": vars(self.settings),
            "findings": [{**vars(finding), "severity": str(finding.severity)} for finding in self.findings],
            "cautions": list(self.cautions),
        }


def compare(
    first: str | os.PathLike[str],
    second: str | os.PathLike[str],
    *,
    fit: bool = False,
    settings: ComparisonSettings | None = None,
) -> NetworkComparison:
    """Compare two network files, vessel by vessel and as resistances.

    Resistances of the second network are taken at the viscosity and velocity profile of the first, so that they
    differ by geometry alone.

    Parameters
    ----------
    first, second : path
        Network files, or folders that hold them.
    fit : bool
        Lay the second network upon the first by a rotation and a shift before comparing.
    settings : ComparisonSettings, optional

    Returns
    -------
    NetworkComparison

    Raises
    ------
    NetworkFileError
        A file cannot be read, is of another version of the format, or is not valid.
    InputError
        The files state different frames.
    ModelError
        Resistances span too many decades for double precision.

    Examples
    --------
    >>> compare("no-such-before.json", "no-such-after.json")
    Traceback (most recent call last):
    geomprep.errors.NetworkFileError: no-such-before.json: cannot be read (No such file or directory)
    """
    settings = settings or ComparisonSettings()
    one, two = read_network(first), read_network(second)
    _check_frames(one, two)
    two = _at_blood_of(one, two)
    motion = None
    if fit:
        resting, moving = (cells(each.vessels.stations, settings.cell).middle for each in (one, two))
        motion = rigid_fit(moving, resting)
        two = _moved(two, motion)
    found = compare_vessels(one.vessels, two.vessels, settings)
    return _answer(one, two, found, motion, settings)


def _check_frames(one: ReadNetwork, two: ReadNetwork) -> None:
    """Refuse two stated frames that differ."""
    frames = [each.tables["conventions"]["frame"] for each in (one, two)]
    if "unknown" not in frames and frames[0] != frames[1]:
        raise InputError(
            f"{one.file} is in the frame {frames[0]}, {two.file} in {frames[1]}: the axes mean different things; "
            "build both in one frame"
        )


def _at_blood_of(one: ReadNetwork, two: ReadNetwork) -> ReadNetwork:
    """The second network with resistances at the blood of the first."""
    friction = [each.tables["blood"]["viscosity"] * each.tables["blood"]["friction_factor"] for each in (one, two)]
    if friction[0] == friction[1]:
        return two
    return replace(two, routes=replace(two.routes, resistance=two.routes.resistance * (friction[0] / friction[1])))


def _moved(network: ReadNetwork, motion: RigidFit) -> ReadNetwork:
    """The network after a rigid motion of its axes."""
    stations = network.vessels.stations
    vessels = replace(network.vessels, stations=replace(stations, position=motion.moved(stations.position)))
    return replace(network, vessels=vessels)


def _answer(
    one: ReadNetwork, two: ReadNetwork, found: Comparison, motion: RigidFit | None, settings: ComparisonSettings
) -> NetworkComparison:
    """The comparison with resistances, effects and findings."""
    whole = route_resistance(one.routes), route_resistance(two.routes)
    resistance = _line_resistances(one, two, found)
    effect, left_out = effects((one.routes, two.routes), whole, found, resistance)
    ends = matched_ends(one, two, found)
    routes, routes_left_out = route_changes((one.routes, two.routes), ends)
    vessels = [
        _vessel((one, two), found, group, resistance[group], (float(effect[group]), whole[0]))
        for group in range(len(found))
    ]
    small = below_limits([(vessel.name, bool(vessel.changes), vessel.effect_part) for vessel in vessels])
    vessels.sort(key=lambda vessel: (not vessel.changes, _rank(vessel)))
    return NetworkComparison(
        files=(one.file, two.file),
        fit=motion,
        vessels=tuple(vessels),
        total=(_known(whole[0]), _known(whole[1])),
        routes=routes,
        ends=ends,
        shared_part=float(found.shared.sum() / found.length.sum()),
        settings=settings,
        findings=(*comparison_findings((one, two), found, settings, ends, (left_out, routes_left_out)), *small),
    )


def _line_resistances(one: ReadNetwork, two: ReadNetwork, found: Comparison) -> np.ndarray[Any, np.dtype[np.float64]]:
    """Resistance of each group in both networks, (g, 2); NaN where its segments form no single line."""
    sums = [
        np.bincount(group, each.routes.resistance, len(found))
        for group, each in zip(found.group, (one, two), strict=True)
    ]
    return np.where(np.isnan(found.inverse_fourth_power), np.nan, np.column_stack(sums))


def _rank(vessel: VesselChange) -> tuple[float, str]:
    """Largest effect first; a vessel that is the only way has the largest; then by name."""
    only_way = vessel.effect is None and bool({"new", "gone"} & set(vessel.changes))
    return -(np.inf if only_way else abs(vessel.effect or 0.0)), vessel.name


def _vessel(
    networks: tuple[ReadNetwork, ReadNetwork],
    found: Comparison,
    group: int,
    resistance: np.ndarray[Any, np.dtype[np.float64]],
    effect: tuple[float, float],
) -> VesselChange:
    """One group as a person reads it."""
    rows = [np.flatnonzero(label == group).tolist() for label in found.group]
    ids = [tuple(network.segment_ids[row] for row in own) for network, own in zip(networks, rows, strict=True)]
    has = [bool(own) for own in rows]
    place: tuple[float, float, float] = tuple(found.place[group].tolist())
    return VesselChange(
        name=_name((networks[0].vessels, networks[1].vessels), rows) or (*ids[0], *ids[1])[0],
        changes=tuple(kind.name.lower() for kind in Change if found.changes[group, kind]),
        segments=(ids[0], ids[1]),
        length=_pair(found.length[group], has),
        shared=_pair(found.shared[group], has),
        radius=_pair(found.radius[group]),
        resistance=_pair(resistance),
        local_ratio=_pair(np.exp(found.local[group])),
        effect=_known(effect[0]),
        effect_part=_known(effect[0] / effect[1]),
        place=place,
    )


def _name(vessels: tuple[Vessels, Vessels], rows: list[list[int]]) -> str:
    """Names of both sides, said once where they agree."""
    words = [
        " + ".join(dict.fromkeys(name for name in each.name[own] if name))
        for each, own in zip(vessels, rows, strict=True)
    ]
    return " → ".join(dict.fromkeys(word for word in words if word))


def _pair(values: Any, known: list[bool] | None = None) -> tuple[float | None, float | None]:
    """Two numbers, None for those that are not known."""
    one, two = (_known(float(value)) if has else None for value, has in zip(values, known or [True] * 2, strict=True))
    return one, two


def _known(value: float) -> float | None:
    """The number, or None where there is none."""
    return float(value) if np.isfinite(value) else None
