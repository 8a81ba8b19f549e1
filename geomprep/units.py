"""The one place where a unit factor is written: text at the door, SI inside.

A quantity in a case file is text with its unit (``"443 mL/min"``). It is read by
:func:`parse_quantity`, which knows the dimension that the key needs and refuses any
other. UCUM codes for the network file are in :data:`UCUM`.

Factors: 1 mmHg = 133.322387415 Pa (conventional millimetre of mercury, ISO 80000-4
note; NIST SP 811 table B.8 prints 133.3224), 1 cmH2O = 98.0665 Pa (NIST SP 811).
"""

from __future__ import annotations

import math
import re
from typing import Final

from geomprep.errors import InputError

__all__ = [
    "DIMENSIONS",
    "LENGTH_UNITS",
    "STANDARD_GRAVITY",
    "UCUM",
    "format_quantity",
    "length_factor",
    "parse_quantity",
    "unit_factor",
]

Dimension = tuple[int, int, int]  # exponents of metre, kilogram, second

DIMENSIONS: Final[dict[str, Dimension]] = {
    "number": (0, 0, 0),
    "length": (1, 0, 0),
    "area": (2, 0, 0),
    "volume": (3, 0, 0),
    "time": (0, 0, 1),
    "frequency": (0, 0, -1),
    "speed": (1, 0, -1),
    "acceleration": (1, 0, -2),
    "density": (-3, 1, 0),
    "pressure": (-1, 1, -2),
    "viscosity": (-1, 1, -1),
    "flow": (3, 0, -1),
    "resistance": (-4, 1, -1),
    "compliance": (4, -1, 2),
    "inertance": (-4, 1, 0),
    "per pressure": (1, -1, 2),
}
"""Dimension of each kind of quantity, as exponents of metre, kilogram and second."""

UCUM: Final[dict[str, str]] = {
    "number": "1",
    "length": "m",
    "area": "m2",
    "volume": "m3",
    "time": "s",
    "frequency": "Hz",
    "speed": "m/s",
    "acceleration": "m/s2",
    "density": "kg/m3",
    "pressure": "Pa",
    "viscosity": "Pa.s",
    "flow": "m3/s",
    "resistance": "Pa.s/m3",
    "compliance": "m3/Pa",
    "inertance": "Pa.s2/m3",
    "per pressure": "/Pa",
    "angle": "rad",
    "conductance": "m3/(Pa.s)",
    "per length": "/m",
    "per volume": "/m3",
}
"""UCUM code of the SI unit in which each kind of quantity is exported."""

STANDARD_GRAVITY: Final = 9.80665
"""Standard acceleration of free fall in m/s² (3rd CGPM 1901; NIST SP 811 table B.8)."""

_MMHG = 133.322387415
_SYMBOLS: Final[dict[str, tuple[float, Dimension]]] = {
    "1": (1.0, (0, 0, 0)),
    "%": (0.01, (0, 0, 0)),
    "m": (1.0, (1, 0, 0)),
    "dm": (0.1, (1, 0, 0)),
    "cm": (1e-2, (1, 0, 0)),
    "mm": (1e-3, (1, 0, 0)),
    "um": (1e-6, (1, 0, 0)),
    "µm": (1e-6, (1, 0, 0)),
    "in": (0.0254, (1, 0, 0)),
    "kg": (1.0, (0, 1, 0)),
    "g": (1e-3, (0, 1, 0)),
    "s": (1.0, (0, 0, 1)),
    "ms": (1e-3, (0, 0, 1)),
    "min": (60.0, (0, 0, 1)),
    "h": (3600.0, (0, 0, 1)),
    "Hz": (1.0, (0, 0, -1)),
    "L": (1e-3, (3, 0, 0)),
    "l": (1e-3, (3, 0, 0)),
    "dL": (1e-4, (3, 0, 0)),
    "mL": (1e-6, (3, 0, 0)),
    "ml": (1e-6, (3, 0, 0)),
    "uL": (1e-9, (3, 0, 0)),
    "N": (1.0, (1, 1, -2)),
    "dyn": (1e-5, (1, 1, -2)),
    "Pa": (1.0, (-1, 1, -2)),
    "hPa": (1e2, (-1, 1, -2)),
    "kPa": (1e3, (-1, 1, -2)),
    "MPa": (1e6, (-1, 1, -2)),
    "GPa": (1e9, (-1, 1, -2)),
    "mPa": (1e-3, (-1, 1, -2)),
    "mmHg": (_MMHG, (-1, 1, -2)),
    "cmH2O": (98.0665, (-1, 1, -2)),
    "mmH2O": (9.80665, (-1, 1, -2)),
    "P": (0.1, (-1, 1, -1)),
    "cP": (1e-3, (-1, 1, -1)),
}
LENGTH_UNITS: Final = tuple(symbol for symbol, (_, dimension) in _SYMBOLS.items() if dimension == (1, 0, 0))
"""Symbols accepted as the length unit of a file."""

_TERM = re.compile(r"(%|1|[A-Za-zµ]+(?:H2O)?)(?:\^?(-?\d))?")
_QUANTITY = re.compile(r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*(.*?)\s*", re.DOTALL)


def _term(text: str, unit: str) -> tuple[float, Dimension]:
    """Factor and dimension of one symbol with an optional power."""
    match = _TERM.fullmatch(text)
    if match is None or match[1] not in _SYMBOLS:
        raise InputError(f"unit '{unit}': '{text}' is no unit known here; write e.g. mm, mL/min, mmHg, kg/m^3, mPa*s")
    factor, dimension = _SYMBOLS[match[1]]
    power = int(match[2] or 1)
    length, mass, time = dimension
    return factor**power, (length * power, mass * power, time * power)


def unit_factor(unit: str) -> tuple[float, Dimension]:
    """Return the factor to SI and the dimension of a unit written as text.

    Parameters
    ----------
    unit : str
        Symbols joined by ``*`` and ``/`` with whole powers, such as ``kg/m^3`` or
        ``mmHg*s/mL``. An empty text is the pure number 1.

    Returns
    -------
    factor : float
    dimension : tuple of int
        Exponents of metre, kilogram, second.

    Raises
    ------
    InputError
        A symbol is unknown.

    Examples
    --------
    >>> unit_factor("mL/min")
    (1.6666666666666667e-08, (3, 0, -1))
    >>> unit_factor("")
    (1.0, (0, 0, 0))
    """
    factor, total = 1.0, (0, 0, 0)
    sign = 1
    for part in re.split(r"([*/·])", unit.replace(" ", "")):
        if part in ("*", "·", "/"):
            sign = -1 if part == "/" else 1
        elif part:
            term, dimension = _term(part, unit)
            factor = factor * term if sign > 0 else factor / term
            total = (total[0] + sign * dimension[0], total[1] + sign * dimension[1], total[2] + sign * dimension[2])
    return factor, total


def parse_quantity(text: str, kind: str, key: str = "quantity") -> float:
    """Read a number with its unit and return it in SI.

    Parameters
    ----------
    text : str
        Number and unit, such as ``"10 mmHg"``.
    kind : str
        Name in :data:`DIMENSIONS` that the value must have.
    key : str
        Name of the key, for the message.

    Returns
    -------
    float
        The value in SI.

    Raises
    ------
    InputError
        No number, no unit, an unknown unit or one of another dimension.

    Examples
    --------
    >>> round(parse_quantity("10 mmHg", "pressure"), 3)
    1333.224
    >>> parse_quantity("10", "pressure", "outlets[0].pressure")
    Traceback (most recent call last):
    geomprep.errors.InputError: outlets[0].pressure = '10': a pressure needs its unit in the text, such as '10 Pa'
    """
    match = _QUANTITY.fullmatch(text)
    if match is None or not math.isfinite(float(match[1])):
        raise InputError(f"{key} = '{text}': expected a number and its unit, such as '10 {_example(kind)}'")
    if not match[2] and kind != "number":
        raise InputError(
            f"{key} = '{text}': a {kind} needs its unit in the text, such as '{match[1]} {_example(kind)}'"
        )
    factor, dimension = unit_factor(match[2])
    if dimension != DIMENSIONS[kind]:
        raise InputError(
            f"{key} = '{text}': '{match[2]}' is no unit of {kind}; write e.g. '{match[1]} {_example(kind)}'"
        )
    return float(match[1]) * factor


def _example(kind: str) -> str:
    """Unit shown in messages for a kind of quantity, in this module's own notation."""
    shown = {"density": "kg/m^3", "viscosity": "mPa*s", "resistance": "Pa*s/m^3", "inertance": "Pa*s^2/m^3",
             "compliance": "mL/mmHg", "flow": "mL/min", "area": "mm^2", "volume": "mL", "acceleration": "m/s^2",
             "per pressure": "1/mmHg", "number": "", "frequency": "Hz"}  # fmt: skip
    return shown.get(kind, UCUM.get(kind, ""))


def length_factor(unit: str, key: str = "length_unit") -> float:
    """Return metres per length unit.

    Raises
    ------
    InputError
        The text is no unit of length.

    Examples
    --------
    >>> length_factor("mm")
    0.001
    """
    if unit not in LENGTH_UNITS:
        raise InputError(f"{key} = '{unit}': no unit of length; choose one of {', '.join(LENGTH_UNITS)}")
    return _SYMBOLS[unit][0]


def format_quantity(value: float, unit: str, digits: int = 4) -> str:
    """Write an SI value in a unit for a person to read.

    Examples
    --------
    >>> format_quantity(1333.22387415, "mmHg")
    '10 mmHg'
    """
    return f"{value / unit_factor(unit)[0]:.{digits}g} {unit}".rstrip()
