"""The table of published rows, read once and checked as it is read."""

from __future__ import annotations

import difflib
import math
import tomllib
from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import Any, Final

from geomprep.errors import InputError
from geomprep.laws.stiffness import RELATIONS
from geomprep.literature.row import CHECKED, KINDS, Row
from geomprep.units import DIMENSIONS, parse_quantity, unit_factor

__all__ = ["parse_rows", "row", "rows"]

_TABLE = Path(__file__).with_name("rows.toml")
_COMMON: Final = {
    *("key", "kind", "of", "vessel_class", "citation", "doi", "place", "checked", "confidence"),
    *("radius", "transmural_pressure", "population", "note", "caution"),
}
_OWN: Final[dict[str, set[str]]] = {
    "value": {"quantity", "value", "range"},
    "relation": {"function", "coefficients"},
    "exponents": {"m", "n"},
    "size": {"size_means", "mean", "spread", "range"},
}
_NEEDED: Final = ("key", "kind", "of", "citation", "checked")
_OWN_NEEDED: Final = {
    "value": ("quantity", "value"),
    "relation": ("function", "coefficients"),
    "exponents": ("m", "n"),
    "size": ("size_means",),
}


@cache
def rows() -> tuple[Row, ...]:
    """Return every published row, in the order of the table.

    Examples
    --------
    >>> rows()[0].key
    'blood-density'
    """
    return parse_rows(_TABLE.read_text(encoding="utf-8"))


def row(key: str) -> Row:
    """Return the row of a key.

    Raises
    ------
    InputError
        No row has this key; the nearest keys are named.

    Examples
    --------
    >>> row("blood-density").value
    1060.0
    >>> row("blood-densty")
    Traceback (most recent call last):
    geomprep.errors.InputError: literature key 'blood-densty' is unknown; the nearest are blood-density...
    """
    found = _by_key().get(key)
    if found is None:
        near = difflib.get_close_matches(key, _by_key(), n=3, cutoff=0.0)
        raise InputError(f"literature key '{key}' is unknown; the nearest are {', '.join(near)}")
    return found


@cache
def _by_key() -> dict[str, Row]:
    """Rows by key."""
    return {one.key: one for one in rows()}


def parse_rows(text: str) -> tuple[Row, ...]:
    """Read rows from TOML text and check each.

    Parameters
    ----------
    text : str
        ``[[row]]`` tables as in the table of this package.

    Raises
    ------
    InputError
        A row lacks a field or has one too many, names an unknown function, unit or class, has
        a key that stands twice, or rests on a memory of low confidence.

    Examples
    --------
    >>> parse_rows("")
    ()
    """
    try:
        table = tomllib.loads(text)
    except tomllib.TOMLDecodeError as fault:
        raise InputError(f"literature table cannot be read: {fault}") from fault
    found = tuple(_parse(fields) for fields in table.get("row", []))
    keys = [one.key for one in found]
    twice = sorted({key for key in keys if keys.count(key) > 1})
    if twice:
        raise InputError(f"literature key '{twice[0]}' stands twice; every row needs its own")
    return found


def _parse(fields: dict[str, Any]) -> Row:
    """Check one TOML table and make its row."""
    name = f"literature row '{fields.get('key', '?')}'"
    _check(name, fields)
    common = {key: fields[key] for key in _COMMON - {"radius", "transmural_pressure"} if key in fields}
    common = {"vessel_class": "any", "doi": "", "place": "", **common}
    if "transmural_pressure" in fields:
        common["transmural_pressure"] = parse_quantity(fields["transmural_pressure"], "pressure", name)
    common["radius_low"], common["radius_high"] = _interval(name, fields.get("radius"), "length")
    return Row(**common, **_HELD[fields["kind"]](name, fields))


def _check(name: str, fields: dict[str, Any]) -> None:
    """Raise where a field is missing, unknown or has an impossible word."""
    missing = [key for key in _NEEDED if not fields.get(key)]
    if missing:
        raise InputError(f"{name}: '{missing[0]}' is missing")
    for key, words in (("kind", KINDS), ("checked", CHECKED)):
        if fields[key] not in words:
            raise InputError(f"{name}: {key} = '{fields[key]}'; choose one of {', '.join(words)}")
    _check_own(name, fields)
    if fields.get("vessel_class", "any") not in ("any", "artery", "vein"):
        raise InputError(f"{name}: vessel_class = '{fields['vessel_class']}'; choose one of any, artery, vein")
    allowed = ("high", "medium") if fields["checked"] == "memory" else ("",)
    if fields.get("confidence", "") not in allowed:
        raise InputError(
            f"{name}: confidence = '{fields.get('confidence', '')}' with checked = '{fields['checked']}'; a memory "
            "needs high or medium (a low one must be read in its source first), anything else has none"
        )


def _check_own(name: str, fields: dict[str, Any]) -> None:
    """Raise where the fields of a kind of row are missing, too many or of the wrong type."""
    unknown = set(fields) - _COMMON - _OWN[fields["kind"]]
    if unknown:
        raise InputError(f"{name}: a row of kind {fields['kind']} has no field '{min(unknown)}'")
    missing = [key for key in _OWN_NEEDED[fields["kind"]] if key not in fields]
    if missing:
        raise InputError(f"{name}: '{missing[0]}' is missing")
    for key, held in fields.items():
        wanted, word = ((int, float), "a number") if key in ("m", "n") else (str, "text")
        parts = held.values() if isinstance(held, dict) else held if isinstance(held, list) else (held,)
        if not all(isinstance(part, wanted) for part in parts):
            raise InputError(f"{name}: {key} = {held!r}: it must be {word}")
    if fields.get("quantity", "number") not in DIMENSIONS:
        raise InputError(f"{name}: quantity = '{fields['quantity']}'; choose one of {', '.join(DIMENSIONS)}")


def _interval(name: str, pair: list[str] | None, quantity: str) -> tuple[float | None, float | None]:
    """Read a printed interval, or none."""
    if pair is None:
        return None, None
    if len(pair) != 2:
        raise InputError(f"{name}: {pair} given; an interval is two quantities")
    low, high = (parse_quantity(text, quantity, name) for text in pair)
    if not low < high:
        raise InputError(f"{name}: interval {pair[0]} to {pair[1]} is empty")
    return low, high


def _value(name: str, fields: dict[str, Any]) -> dict[str, Any]:
    """Fields of a row that holds one value."""
    quantity = fields["quantity"]
    low, high = _interval(name, fields.get("range"), quantity)
    return {
        "quantity": quantity,
        "value": parse_quantity(fields["value"], quantity, name),
        "low": low,
        "high": high,
    }


def _relation(name: str, fields: dict[str, Any]) -> dict[str, Any]:
    """Fields of a row that names a function and its coefficients."""
    relation = RELATIONS.get(fields["function"])
    if relation is None:
        raise InputError(f"{name}: function '{fields['function']}' is unknown; choose one of {', '.join(RELATIONS)}")
    texts = fields["coefficients"]
    if set(texts) != {coefficient for coefficient, _ in relation.coefficients}:
        raise InputError(f"{name}: {fields['function']} takes {', '.join(key for key, _ in relation.coefficients)}")
    values = tuple((key, _coefficient(name, texts[key], unit)) for key, unit in relation.coefficients)
    return {"function": fields["function"], "coefficients": values}


def _coefficient(name: str, text: str, unit: str) -> float:
    """Read a coefficient whose dimension is that of a unit, which no kind of quantity may name."""
    number, _, given = text.partition(" ")
    factor, dimension = unit_factor(given)
    if dimension != unit_factor(unit)[1]:
        raise InputError(f"{name}: coefficient '{text}' must have the dimension of '{unit or '1'}'")
    try:
        return float(number) * factor
    except ValueError as fault:
        raise InputError(f"{name}: coefficient '{text}': expected a number and its unit") from fault


def _exponents(name: str, fields: dict[str, Any]) -> dict[str, Any]:
    """Fields of a row that holds the exponents of a power pair."""
    return {"coefficients": (("m", float(fields["m"])), ("n", float(fields["n"])))}


def _size(name: str, fields: dict[str, Any]) -> dict[str, Any]:
    """Fields of a row of vessel size: everything as a radius.

    The interval is the printed one, else mean ± 2 standard deviations, else the mean alone.
    """
    means = fields["size_means"]
    if means not in _RADIUS_OF:
        raise InputError(f"{name}: size_means = '{means}'; choose one of {', '.join(_RADIUS_OF)}")
    quantity, radius = _RADIUS_OF[means]
    mean = parse_quantity(fields["mean"], quantity, name) if "mean" in fields else None
    low, high = _interval(name, fields.get("range"), quantity)
    if low is None and mean is not None:
        spread = parse_quantity(fields["spread"], quantity, name) if "spread" in fields else 0.0
        low, high = mean - 2 * spread, mean + 2 * spread
    if low is None or high is None or low <= 0:
        raise InputError(f"{name}: a size needs a mean or an interval above zero")
    value = None if mean is None else radius(mean)
    return {"quantity": "length", "value": value, "low": radius(low), "high": radius(high)}


_RADIUS_OF: Final[dict[str, tuple[str, Callable[[float], float]]]] = {
    "radius": ("length", float),
    "diameter": ("length", lambda diameter: diameter / 2),
    "area": ("area", lambda area: math.sqrt(area / math.pi)),
}
_Reader = Callable[[str, dict[str, Any]], dict[str, Any]]
_HELD: Final[dict[str, _Reader]] = {"value": _value, "relation": _relation, "exponents": _exponents, "size": _size}
