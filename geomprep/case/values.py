"""Reading one value of a case file by its kind; every fault names value, rule and way out."""

from __future__ import annotations

import math
import operator
import os
import re
from collections.abc import Callable
from pathlib import Path
from typing import Any, Final

from geomprep.case.keys import Key, nearest
from geomprep.case.sections import StationSpacing
from geomprep.errors import CaseError, InputError
from geomprep.files.statement import FRAME_AXES
from geomprep.units import DIMENSIONS, parse_quantity

__all__ = ["read_value"]

_COMPARE: Final[dict[str, Callable[[float, float], bool]]] = {
    ">": operator.gt,
    ">=": operator.ge,
    "<": operator.lt,
    "<=": operator.le,
}


def read_value(value: Any, key: Key, path: str, folder: Path) -> Any:
    """Return a value of a case file in SI, as its key needs it.

    Parameters
    ----------
    value : object
        What the TOML file holds.
    key : Key
        Row of the table of keys.
    path : str
        Name of the key for messages, such as ``outlets[0].pressure``.
    folder : pathlib.Path
        Folder that files are relative to.

    Raises
    ------
    CaseError
        Wrong type, missing or wrong unit, unknown choice, or out of bounds.

    Examples
    --------
    >>> from geomprep.case.keys import key_table
    >>> read_value("4 m/s", key_table()["walls.*"]["wave_speed"], "walls.vein.wave_speed", Path())
    4.0
    >>> read_value(0.6, key_table()["walls.*"]["poisson_ratio"], "walls.vein.poisson_ratio", Path())
    Traceback (most recent call last):
    geomprep.errors.CaseError: walls.vein.poisson_ratio = 0.6: must be >= 0 and <= 0.5
    """
    try:
        if key.kind in DIMENSIONS:
            return _quantity(value, key, path)
        return _READERS[key.kind](value, key, path, folder)
    except CaseError:
        raise
    except InputError as error:
        raise CaseError(str(error)) from error


def _shown(value: Any) -> str:
    """A value as it stands in the file, shortened."""
    text = f"'{value}'" if isinstance(value, str) else str(value).lower() if isinstance(value, bool) else repr(value)
    return text if len(text) <= 60 else text[:57] + "..."


def _fault(value: Any, path: str, rule: str) -> CaseError:
    """The one form of every message."""
    return CaseError(f"{path} = {_shown(value)}: {rule}")


def _example(key: Key) -> str:
    """The example of a key as it would be written."""
    return key.example if key.example[:1] in "[{" else f'"{key.example}"'


def _number(value: float) -> float:
    """The number as a float; infinite where it is too large for one."""
    try:
        return float(value)
    except OverflowError:
        return math.inf


def _within(number: float, value: Any, key: Key, path: str) -> float:
    """The number, if it is finite and keeps the rule of its key."""
    if not math.isfinite(number):
        raise _fault(value, path, "must be a finite number")
    for part in filter(None, key.rule.split(" and ")):
        sign, limit = part.split()
        if not _COMPARE[sign](number, float(limit)):
            raise _fault(value, path, f"must be {key.rule}")
    return number


def _quantity(value: Any, key: Key, path: str) -> float | None:
    """A quantity in SI; None for a word that stands for no value."""
    if value in key.words:
        return None
    plain = isinstance(value, int | float) and not isinstance(value, bool)
    if key.kind == "number" and plain:
        return _within(_number(value), value, key, path)
    if plain:
        rule = f"a bare number; a {key.kind} needs its unit in the text, such as {_example(key)}"
        raise _fault(value, path, rule)
    if not isinstance(value, str):
        raise _fault(value, path, f"must be a {key.kind}, such as {_example(key)}")
    try:
        number = parse_quantity(value, key.kind, path)
    except InputError as error:
        words = f" or '{key.words[0]}'" if key.words else ""
        raise CaseError(f"{error}{words}") from error
    return _within(number, value, key, path)


def _text(value: Any, key: Key, path: str, folder: Path) -> str:
    """Text that is not empty."""
    if not isinstance(value, str) or not value.strip():
        raise _fault(value, path, f"must be text, such as {_example(key)}")
    if "\n" in value.strip():
        raise _fault(value, path, "must be text of one line")
    return value.strip()


def _choice(value: Any, key: Key, path: str, folder: Path) -> str:
    """One of the words of the key."""
    if value not in key.words:
        hint = f"; {nearest(value, list(key.words))}" if isinstance(value, str) else ""
        hint = hint if "did you mean" in hint else ""
        raise _fault(value, path, f"must be one of {', '.join(key.words)}{hint}")
    return str(value)


def _file(value: Any, key: Key, path: str, folder: Path) -> str:
    """A path that names an existing file."""
    name = _text(value, key, path, folder)
    if not os.path.isfile(folder / name):  # noqa: PTH113 - says no to names that no system takes
        raise _fault(value, path, "no such file; paths are relative to the folder of the case file")
    return name


def _names(value: Any, key: Key, path: str, folder: Path) -> tuple[str, ...]:
    """A list of names; one name may stand without a list."""
    items = value if isinstance(value, list) else [value]
    if not items or not all(isinstance(item, str) and item.strip() for item in items):
        raise _fault(value, path, f"must be a list of names, such as {_example(key)}, or '{key.words[0]}'")
    return tuple(item.strip() for item in items)


def _frame(value: Any, key: Key, path: str, folder: Path) -> str:
    """Three letters, one of each pair L/R, P/A, S/I."""
    letters = value.upper() if isinstance(value, str) else ""
    if len(letters) != 3 or any(sum(letter in axis for letter in letters) != 1 for axis in FRAME_AXES):
        rule = 'must be three letters, one each of L or R, P or A, S or I, in the order of x, y, z, such as "LPS"'
        raise _fault(value, path, rule)
    return letters


def _three_lengths(value: Any, key: Key, path: str, folder: Path) -> tuple[float, ...]:
    """Three lengths in metres."""
    if not isinstance(value, list) or len(value) != 3:
        raise _fault(value, path, f"must be three lengths, such as {_example(key)}")
    one = Key(key.section, key.key, "length", (), "", key.rule, "0.6 mm", "")
    return tuple(_quantity(item, one, f"{path}[{number}]") or 0.0 for number, item in enumerate(value))


_OF_RADIUS = re.compile(r"([+-]?(?:\d+\.?\d*|\.\d+))\s*(?:of\s+the\s+)?radius")


def _spacing(value: Any, key: Key, path: str, folder: Path) -> StationSpacing | None:
    """As drawn (None), a part of the radius, or a length."""
    if value in key.words:
        return None
    match = _OF_RADIUS.fullmatch(value.strip()) if isinstance(value, str) else None
    if match:
        return StationSpacing(of_radius=_within(float(match[1]), value, key, path))
    if not isinstance(value, str) or not any(letter.isdigit() for letter in value):
        raise _fault(value, path, 'must be "as drawn", a part of the radius such as "0.5 radius", or a length')
    length = Key(key.section, key.key, "length", (), "", key.rule, "1 mm", "")
    return StationSpacing(length=_quantity(value, length, path))


def _number_or_key(value: Any, key: Key, path: str, folder: Path) -> float | str:
    """A number, or the key of a literature row."""
    if isinstance(value, int | float) and not isinstance(value, bool):
        return _within(_number(value), value, key, path)
    return _text(value, key, path, folder)


def _boolean(value: Any, key: Key, path: str, folder: Path) -> bool:
    """True or false."""
    if not isinstance(value, bool):
        raise _fault(value, path, "must be true or false, without quotes")
    return value


def _class_values(value: Any, key: Key, path: str, folder: Path) -> tuple[float, float]:
    """The numbers that mean artery and vein."""
    given = value if isinstance(value, dict) else {}
    numbers = [given.get(name) for name in ("artery", "vein")]
    right = all(isinstance(number, int | float) and not isinstance(number, bool) for number in numbers)
    if not right or len(given) != 2 or numbers[0] == numbers[1]:
        raise _fault(value, path, f"must give two different numbers, such as {_example(key)}")
    return _number(numbers[0]), _number(numbers[1])  # type: ignore[arg-type]


_READERS: Final[dict[str, Callable[[Any, Key, str, Path], Any]]] = {
    "text": _text,
    "choice": _choice,
    "boolean": _boolean,
    "file": _file,
    "names": _names,
    "frame": _frame,
    "three lengths": _three_lengths,
    "spacing": _spacing,
    "number or key": _number_or_key,
    "class values": _class_values,
}
