"""Rules that hold between keys of a case file."""

from __future__ import annotations

from collections.abc import Iterator

from geomprep.case.sections import CalibrationSection, Case, InletSection, OutletSection, WallsSection

__all__ = ["contradictions"]


def contradictions(case: Case) -> Iterator[str]:
    """Yield one line for every pair of keys that cannot stand together.

    Parameters
    ----------
    case : Case
        A case whose single values are all right.

    Yields
    ------
    str
        Value, rule, way out.
    """
    for name, walls in case.walls.items():
        yield from _of_walls(f"walls.{name}", walls)
    for number, inlet in enumerate(case.inlets):
        yield from _of_inlet(f"inlets[{number}]", inlet)
    for number, outlet in enumerate(case.outlets):
        yield from _of_outlet(f"outlets[{number}]", outlet, case.calibration)
    yield from _places(case)
    if case.calibration:
        yield from _of_calibration(case.calibration, case.outlets)


def _given(record: object, *names: str) -> list[str]:
    """Names of fields that are not None."""
    return [name for name in names if getattr(record, name) is not None]


def _of_walls(path: str, walls: WallsSection) -> Iterator[str]:
    """A wave speed or a modulus, and only with user stiffness."""
    elastic = _given(walls, "young_modulus", "wall_thickness", "poisson_ratio")
    if walls.wave_speed is not None and elastic:
        yield f"{path}: wave_speed and {elastic[0]} both state the stiffness; keep one of them"
    own = _given(walls, "wave_speed", "young_modulus")
    if walls.stiffness == "user" and not own:
        yield f"{path}.stiffness = 'user': give wave_speed, or young_modulus and wall_thickness"
    if walls.stiffness not in (None, "user") and own:
        yield f"{path}.stiffness = '{walls.stiffness}': {own[0]} is given too; drop it or write stiffness = \"user\""
    if walls.young_modulus is not None and walls.wall_thickness is None:
        yield f"{path}.wall_thickness: missing; young_modulus needs it"


def _of_inlet(path: str, inlet: InletSection) -> Iterator[str]:
    """Exactly one of flow and pressure."""
    given = _given(inlet, "mean_flow", "pressure")
    if len(given) != 1:
        yield f"{path}: {'both' if given else 'neither'} of mean_flow and pressure given; give one"


_OWN = {
    "fixed pressure": ("pressure",),
    "resistance": ("far_pressure", "resistance", "mean_flow", "share"),
    "three-element windkessel": (
        "far_pressure",
        "resistance",
        "characteristic_resistance",
        "peripheral_resistance",
        "compliance",
        "mean_flow",
        "share",
    ),
}
_ALL = ("pressure", *_OWN["three-element windkessel"])


def _of_outlet(path: str, outlet: OutletSection, calibration: CalibrationSection | None) -> Iterator[str]:
    """The keys that the model needs, and no others."""
    model = outlet.model or (calibration.model if calibration else None)
    if model is None:
        yield f"{path}.model: missing; choose one of {', '.join(_OWN)}, or set calibration.model"
        return
    for name in _given(outlet, *(name for name in _ALL if name not in _OWN[model])):
        yield f"{path}.{name}: no key of the model '{model}'; it takes {', '.join(_OWN[model])}"
    if model == "fixed pressure" and outlet.pressure is None:
        yield f'{path}.pressure: missing; a fixed pressure needs it, e.g. pressure = "5 mmHg"'
    if model == "resistance" and outlet.resistance is None and calibration is None:
        yield f"{path}.resistance: missing; give it, or a [calibration] section that finds it"
    if model == "three-element windkessel":
        yield from _of_windkessel(path, outlet, calibration)


def _of_windkessel(path: str, outlet: OutletSection, calibration: CalibrationSection | None) -> Iterator[str]:
    """Total and parts agree, and what is missing can be calibrated."""
    total, first, second = outlet.resistance, outlet.characteristic_resistance, outlet.peripheral_resistance
    if total is not None and second is not None:
        yield f"{path}: resistance (the total) and peripheral_resistance both given; keep one"
    if total is not None and first is not None and first >= total:
        yield (
            f"{path}.characteristic_resistance = {first:.4g} Pa*s/m^3: must be less than the total resistance "
            f"{total:.4g} Pa*s/m^3"
        )
    if calibration is None:
        if total is None and second is None:
            yield f"{path}: give resistance or peripheral_resistance, or a [calibration] section that finds them"
        if outlet.compliance is None:
            yield f"{path}.compliance: missing; give it, or a [calibration] section that finds it"


def _places(case: Case) -> Iterator[str]:
    """No two inlets or outlets at one place."""
    seen: dict[str, str] = {}
    places = [(f"inlets[{number}].at", inlet.at) for number, inlet in enumerate(case.inlets)]
    places += [(f"outlets[{number}].at", outlet.at) for number, outlet in enumerate(case.outlets)]
    for path, place in places:
        if place in seen:
            yield f"{path} = '{place}': {seen[place]} is there already; one open end takes one model"
        seen[place] = path


def _of_calibration(calibration: CalibrationSection, outlets: tuple[OutletSection, ...]) -> Iterator[str]:
    """The split has what it needs; shares do not exceed the whole."""
    if calibration.split == "radius power" and calibration.exponent is None:
        yield "calibration.split = 'radius power': give its exponent, e.g. exponent = 3"
    if calibration.split == "shares" and calibration.exponent is not None:
        yield "calibration.exponent: no key of the split 'shares'; drop it or write split = \"radius power\""
    if calibration.compliance is not None and calibration.time_constant is not None:
        yield "calibration: compliance and time_constant both set the compliance; keep one of them"
    total = sum(outlet.share or 0.0 for outlet in outlets)
    if total > 1.0 + 1e-9:
        yield f"outlets: the shares add up to {total:.6g}; together they must be at most 1"
    flows = sum(outlet.mean_flow or 0.0 for outlet in outlets)
    if calibration.total_flow is not None and flows > calibration.total_flow * (1.0 + 1e-9):
        yield (
            f"outlets: the mean flows add up to {flows * 6e7:.6g} mL/min, more than calibration.total_flow "
            f"{calibration.total_flow * 6e7:.6g} mL/min"
        )
