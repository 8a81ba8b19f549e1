"""What makes a comparison doubtful, said beside it."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any, Final

from geomprep.case.compare_routes import EndPair
from geomprep.case.network_reading import ReadNetwork
from geomprep.findings import Finding, Severity
from geomprep.measure.comparison import Comparison, ComparisonSettings

__all__ = ["below_limits", "comparison_findings"]

_SHARED: Final = 0.5
"""Part of the length below which two networks are hardly of one subject in one frame; a judgement."""

_TOGETHER: Final = 0.01
"""Part of a resistance from which the sum of small changes is said; a judgement."""

_NAMED: Final = 3
"""Ends that a message names."""

_STATED: Final = (
    ("posture of the model", "conventions", "posture", "veins change calibre with posture"),
    ("start of vessels at junctions", "conventions", "vessels_start_at", "lengths and resistances differ by it alone"),
    ("posture at imaging", "imaging_state", "posture", "veins change calibre with posture"),
    ("cardiac phase at imaging", "imaging_state", "cardiac_phase", "calibres change over the beat"),
)
"""What is said, table, field, why it matters."""


def comparison_findings(
    networks: tuple[ReadNetwork, ReadNetwork],
    found: Comparison,
    settings: ComparisonSettings,
    ends: tuple[EndPair, ...],
    left_out: tuple[int, int],
) -> tuple[Finding, ...]:
    """Return what was seen beside the changes.

    Parameters
    ----------
    networks : tuple of two ReadNetwork
    found : Comparison
    settings : ComparisonSettings
    ends : tuple of EndPair
    left_out : tuple of int
        Vessels whose effect, and pairs of ends whose resistance was not computed.
    """
    return (
        *_little_shared(found),
        *_statements(networks),
        *_unmatched(ends),
        *_noise(settings),
        *_left_out(*left_out),
    )


def _little_shared(found: Comparison) -> Iterator[Finding]:
    """Two networks that hardly run along one another."""
    part = float(found.shared.sum() / found.length.sum())
    if part < _SHARED:
        yield Finding(
            "little in common",
            Severity.ERROR,
            f"only {part:.0%} of the length of both networks runs along the other (half is the least that compares): "
            "are both of one subject and in one frame? '--fit' lays a moved network upon the other",
            value=part,
            limit=_SHARED,
            unit="1",
        )


def _statements(networks: tuple[ReadNetwork, ReadNetwork]) -> Iterator[Finding]:
    """What both files state and state differently."""
    for what, table, key, why in _STATED:
        said = [_said(network.tables[table].get(key)) for network in networks]
        if said[0] != said[1]:
            yield Finding("stated differently", Severity.WARNING, f"{what}: {said[0]} and {said[1]}; {why}")
    frames = [network.tables["conventions"]["frame"] for network in networks]
    if frames[0] != frames[1]:
        yield Finding(
            "stated differently", Severity.WARNING, f"frame: {frames[0]} and {frames[1]}; taken as one and the same"
        )
    meanings = [_sizes(network) for network in networks]
    if meanings[0] != meanings[1]:
        yield Finding(
            "stated differently",
            Severity.WARNING,
            f"sizes in the files: {meanings[0]} and {meanings[1]}; such radii differ where a lumen is not round",
        )
    blood = [tuple(network.tables["blood"][key] for key in ("viscosity", "velocity_profile")) for network in networks]
    if blood[0] != blood[1]:
        yield Finding(
            "stated differently",
            Severity.NOTE,
            f"viscosity in Pa·s and velocity profile: {blood[0]} and {blood[1]}; resistances of both are taken at "
            "those of the first",
        )


def _said(value: Any) -> str:
    """A statement as a word."""
    return str(value) if value else "not stated"


def _sizes(network: ReadNetwork) -> str:
    """What the sizes in the inputs of a network mean."""
    return ", ".join(sorted({record["size_means"] for record in network.tables["provenance.inputs"]}))


def _unmatched(ends: tuple[EndPair, ...]) -> Iterator[Finding]:
    """Inlets and outlets of one network alone."""
    for which, other in (("first", 1), ("second", 0)):
        alone = [f"{end.role} at {end.name}" for end in ends if end.nodes[other] is None]
        if alone:
            more = f" and {len(alone) - _NAMED} more" if len(alone) > _NAMED else ""
            yield Finding(
                "ends of one network",
                Severity.WARNING,
                f"{len(alone)} end(s) stand in the {which} network only: {', '.join(alone[:_NAMED])}{more}; the "
                "resistance from all inlets to all outlets differs by that alone",
            )


def _noise(settings: ComparisonSettings) -> Iterator[Finding]:
    """No word about noise."""
    if settings.voxel is None and settings.radius_deviation is None:
        yield Finding(
            "no noise stated",
            Severity.NOTE,
            "neither a voxel nor the scatter of the radii is stated, so that a change is not held against the noise; "
            "give --voxel or --radius-noise",
        )


def below_limits(vessels: Sequence[tuple[str, bool, float | None]]) -> tuple[Finding, ...]:
    """Return a note where vessels that do not count as changed move the resistance from inlets to outlets together.

    Parameters
    ----------
    vessels : sequence of tuple
        Name, whether it differs, and effect over the resistance of the first network (None where not known).

    Examples
    --------
    >>> below_limits([("a", True, 0.5), ("b", False, 0.001)])
    ()
    >>> below_limits([("a", False, -0.03), ("b", False, 0.001)])[0].value
    -0.029
    """
    small = [(abs(part), part, name) for name, differs, part in vessels if not differs and part is not None]
    total = sum(part for _, part, _ in small)
    if abs(total) < _TOGETHER:
        return ()
    _, part, name = max(small)
    return (
        Finding(
            "below the limits",
            Severity.NOTE,
            f"vessels that differ by less than the limits change the resistance from inlets to outlets by "
            f"{100 * total:+.2g} % together, most of all {name} ({100 * part:+.2g} %)",
            where=name,
            value=round(total, 12),
            limit=_TOGETHER,
            unit="1",
        ),
    )


def _left_out(effects: int, routes: int) -> Iterator[Finding]:
    """What was too much to compute."""
    if effects:
        yield Finding(
            "left out",
            Severity.NOTE,
            f"the effect of {effects} vessels of the smallest change of resistance is not given",
        )
    if routes:
        yield Finding("left out", Severity.NOTE, f"{routes} pairs of an inlet and an outlet are not listed")
