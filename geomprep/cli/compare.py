"""``geomprep compare A B``: what differs between two networks, and what it does to resistance."""

from __future__ import annotations

import argparse
import math
from pathlib import Path

from geomprep.case.compare import NetworkComparison, VesselChange, compare
from geomprep.case.compare_routes import RouteChange
from geomprep.cli.console import Console, table
from geomprep.errors import InputError
from geomprep.findings import Severity, most_severe
from geomprep.measure.comparison_settings import ComparisonSettings
from geomprep.units import format_quantity, parse_quantity, unit_factor

__all__ = ["add_arguments", "run"]

_SHOWN = 30
_ROUTE_CHANGE = 0.005
"""Relative change from which a route is shown unasked."""
_ROUNDING = 1e-6
_DEFAULT = ComparisonSettings()


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the arguments of this command."""
    parser.add_argument("first", metavar="A", type=Path, help="a network file, or a folder that holds one")
    parser.add_argument("second", metavar="B", type=Path, help="the network that is held against it")
    parser.add_argument("--fit", action="store_true", help="lay B upon A by a rotation and a shift first")
    parser.add_argument("--voxel", metavar="LENGTH", help="longest voxel edge of the images, such as '0.6 mm'")
    parser.add_argument("--radius-noise", metavar="LENGTH", help="standard deviation of a radius (a quarter voxel)")
    for name, key, what in (
        ("--within", "within", "distance of two axes that are one vessel, in parts of the radius"),
        ("--length-change", "length_change", "relative change from which a vessel is longer or shorter"),
        ("--radius-change", "radius_change", "relative change from which a vessel is wider or narrower"),
        ("--local-change", "local_change", "the same at one place of it"),
    ):
        default = getattr(_DEFAULT, key)
        parser.add_argument(name, metavar="NUMBER", dest=key, default=str(default), help=f"{what} ({default:g})")


def run(arguments: argparse.Namespace, console: Console) -> int:
    """Compare; 1 where a finding of severity error says that the two hardly compare."""
    found = compare(arguments.first, arguments.second, fit=arguments.fit, settings=_settings(arguments))
    console.say(*_lines(found, console.verbose))
    console.document(found.to_dict())
    return 1 if most_severe(found.findings) is Severity.ERROR else 0


def _settings(arguments: argparse.Namespace) -> ComparisonSettings:
    """Settings with what was given."""
    voxel = parse_quantity(arguments.voxel, "length", "--voxel") if arguments.voxel else None
    noise = parse_quantity(arguments.radius_noise, "length", "--radius-noise") if arguments.radius_noise else None
    return ComparisonSettings(
        within=_number(arguments.within, "within"),
        length_change=_number(arguments.length_change, "length_change"),
        radius_change=_number(arguments.radius_change, "radius_change"),
        local_change=_number(arguments.local_change, "local_change"),
        voxel=voxel,
        radius_deviation=noise,
    )


def _number(text: str, key: str) -> float:
    """A number as typed."""
    option = f"--{key.replace('_', '-')}"
    try:
        value = float(text)
    except ValueError:
        value = math.nan
    if not math.isfinite(value):
        raise InputError(f"{option} = '{text}': a number is needed, such as {getattr(_DEFAULT, key):g}")
    return value


def _lines(found: NetworkComparison, verbose: bool) -> list[str]:
    """A comparison for a person."""
    changed = found.changed
    total = (
        f"resistance from inlets to outlets: {_resistance(found.total[0])} → {_resistance(found.total[1])}"
        f"{_percent(found.total, ' ({})')}"
    )
    return [
        f"A  {found.files[0]}",
        f"B  {found.files[1]}{_fit(found)}",
        f"   {found.shared_part:.1%} of the length runs along the other; "
        f"{len(changed)} of {len(found.vessels)} vessels differ",
        f"   {total}",
        "",
        f"vessels that differ{' and those that do not' if verbose else ''} (A → B)",
        *_vessels(found.vessels if verbose else changed, verbose),
        *_routes(found, verbose),
        "",
        "findings",
        *([f"  {each.severity:<8} {each.message}" for each in found.findings] or ["  none"]),
        "",
        "cautions",
        *(f"  {caution}" for caution in found.cautions),
    ]


def _fit(found: NetworkComparison) -> str:
    """The motion of B, where there was one."""
    if found.fit is None:
        return ""
    shift = ", ".join(f"{1e3 * value:.3g}" for value in found.fit.shift)
    return (
        f", laid upon A: turned by {math.degrees(found.fit.angle):.3g}°, then shifted by ({shift}) mm; "
        f"{1e3 * found.fit.distance:.2g} mm apart after that (root mean square)"
    )


def _vessels(vessels: tuple[VesselChange, ...], verbose: bool) -> list[str]:
    """One line per vessel; the first thirty unless all are wanted."""
    if not vessels:
        return ["  none"]
    shown = vessels if verbose else vessels[:_SHOWN]
    rows = [
        [
            vessel.name,
            ", ".join(vessel.changes) or "same",
            _millimetres(vessel.length),
            _millimetres(vessel.radius),
            _ratios(vessel.local_ratio),
            _percent(vessel.resistance, "{}") or "–",
            _effect(vessel),
            ", ".join(f"{1e3 * value:.4g}" for value in vessel.place),
        ]
        for vessel in shown
    ]
    more = len(vessels) - len(shown)
    head = ["vessel", "change", "length, mm", "radius, mm", "ratio along it", "own R", "R inlets to outlets", "at, mm"]
    return [*table(head, rows), *([f"  … and {more} more (--verbose shows all)"] if more else [])]


def _effect(vessel: VesselChange) -> str:
    """What the change does to the whole."""
    if vessel.effect_part is not None:
        return _signed(vessel.effect_part)
    return "only way" if {"new", "gone"} & set(vessel.changes) else "–"


def _routes(found: NetworkComparison, verbose: bool) -> list[str]:
    """Resistance of single routes: those that change, the largest change first, or all."""
    shown = [route for route in found.routes if verbose or _moved(route) >= _ROUTE_CHANGE]
    if not shown:
        return []
    shown = shown if verbose else sorted(shown, key=_moved, reverse=True)
    rows = [
        [route.inlet, route.outlet, *map(_resistance, route.resistance), _percent(route.resistance, "{}")]
        for route in shown
    ]
    kept = rows if verbose else rows[:_SHOWN]
    more = len(found.routes) - len(kept)
    return [
        "",
        "resistance from one inlet to one outlet, the other ends closed",
        *table(["inlet", "outlet", "A", "B", "change"], kept),
        *([f"  … and {more} more that change less (--verbose shows all)"] if more else []),
    ]


def _moved(route: RouteChange) -> float:
    """Size of the change of a route; infinite where one network has no such way."""
    first, second = route.resistance
    if first is None or second is None:
        return 0.0 if first is second else math.inf
    return abs(math.log(second / first))


def _millimetres(pair: tuple[float | None, float | None]) -> str:
    """Two lengths, once where they read the same."""
    words = ["–" if value is None else f"{value / unit_factor('mm')[0]:.3g}" for value in pair]
    return words[0] if words[0] == words[1] else " → ".join(words)


def _ratios(pair: tuple[float | None, float | None]) -> str:
    """Least and largest ratio of the radii along a vessel."""
    return " to ".join("–" if value is None else f"{value:.2f}" for value in pair) if pair[0] is not None else "–"


def _resistance(value: float | None) -> str:
    """A resistance for a person."""
    return "no way" if value is None else format_quantity(value, "mmHg*s/mL", 3)


def _percent(pair: tuple[float | None, float | None], form: str) -> str:
    """Relative change of a pair, or nothing."""
    if pair[0] is None or pair[1] is None:
        return ""
    return form.format(_signed(pair[1] / pair[0] - 1))


def _signed(part: float) -> str:
    """A relative change in per cent; zero where it is rounding."""
    if abs(part) < _ROUNDING:
        return "0 %"
    return f"{100 * part:+.0f} %" if abs(part) >= 1 else f"{100 * part:+.2g} %"
