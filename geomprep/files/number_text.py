"""Numbers written as text: as many as declared, and each one a number.

A parser that reads numbers one after the other stops at the first odd sign, or takes
``1.2.3`` for two numbers and shifts all that follow. The text is looked at in windows of
whole numbers, by classes of its bytes: no Python loop over numbers.
"""

from __future__ import annotations

import re

import numpy as np
import numpy.typing as npt

from geomprep.errors import FileError

__all__ = ["end_of_numbers"]

_WINDOW = 1 << 20
_SPACE, _DIGIT, _SIGN, _DOT, _EXPONENT, _OTHER = range(6)
_WORD = re.compile(rb"[+-]?(?:nan(?:\(\w*\))?|inf(?:inity)?)", re.IGNORECASE)
_NUMBER = re.compile(rb"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?")


def _class_of_byte() -> npt.NDArray[np.uint8]:
    """Class of each of the 256 bytes."""
    table = np.full(256, _OTHER, np.uint8)
    for signs, kind in ((b" \t\n\v\f\r", _SPACE), (b"0123456789", _DIGIT), (b"+-", _SIGN), (b".", _DOT)):
        table[list(signs)] = kind
    table[list(b"eE")] = _EXPONENT
    return table


def _allowed_pairs() -> npt.NDArray[np.bool_]:
    """Whether b may follow a, for each pair of neighbouring classes (6 a + b)."""
    follows = {
        _SPACE: (_SPACE, _DIGIT, _SIGN, _DOT),
        _DIGIT: (_SPACE, _DIGIT, _DOT, _EXPONENT),
        _SIGN: (_DIGIT, _DOT),
        _DOT: (_SPACE, _DIGIT, _EXPONENT),
        _EXPONENT: (_DIGIT, _SIGN),
    }
    table = np.zeros(36, np.bool_)
    for first, seconds in follows.items():
        table[[6 * first + second for second in seconds]] = True
    return table


_CLASSES, _PAIRS = _class_of_byte(), _allowed_pairs()


def end_of_numbers(name: str, data: bytes, span: tuple[int, int], count: int | None, what: str, kind: str) -> int:
    """Return where the `count`-th number ends, all numbers up to there being well-formed.

    Parameters
    ----------
    name : str
        Name of the file, for the message.
    data : bytes
        Bytes of the file.
    span : (int, int)
        First byte of the text and the byte after its last.
    count : int or None
        How many numbers are needed; None takes the whole span and returns their number
        instead of a position.
    what : str
        What the numbers are, for the message.
    kind : str
        ``f`` for any number, ``i`` for whole numbers, ``u`` for whole numbers without sign.

    Raises
    ------
    FileError
        A number is malformed, or there are too few.

    Examples
    --------
    >>> end_of_numbers("a.vtk", b"1 2.5 x", (0, 7), 2, "points", "f")
    5
    >>> end_of_numbers("a.vtk", b"", (0, 0), None, "points", "f")
    0
    >>> end_of_numbers("a.vtk", b"1 2.5.1", (0, 7), 2, "points", "f")
    Traceback (most recent call last):
    geomprep.errors.FileError: a.vtk: '2.5.1' in points is no number; ...
    """
    position, stop = span
    found = 0
    while position < stop and (count is None or found < count):
        window = _whole_window(data, position, stop)
        classes = _CLASSES[np.frombuffer(window, np.uint8)]
        solid = classes != _SPACE
        starts = solid.copy()
        starts[1:] &= ~solid[:-1]
        here = int(np.count_nonzero(starts))
        if count is not None and found + here >= count:
            last = int(np.flatnonzero(starts)[count - found - 1])
            after = np.flatnonzero(~solid[last:])
            length = last + int(after[0]) if len(after) else len(window)
            window, classes, here = window[:length], classes[:length], count - found
        _check(name, window, classes, what, kind)
        found += here
        position += len(window)
    if count is None:
        return found
    if found < count:
        raise FileError(
            name, f"{what}: {count} numbers are declared, only {found} are there; cut short or damaged, write it anew"
        )
    return position


def _whole_window(data: bytes, position: int, stop: int) -> bytes:
    """The next piece of text, cut behind a white space so that no number is cut."""
    window = data[position : min(position + _WINDOW, stop)]
    if position + len(window) == stop:
        return window
    cut = max(window.rfind(space) for space in (b" ", b"\n", b"\t", b"\r"))
    return window[: cut + 1] if cut > 0 else window


def _check(name: str, window: bytes, classes: npt.NDArray[np.uint8], what: str, kind: str) -> None:
    """Raise where something between white spaces is no number of its kind."""
    present = np.bincount(classes, minlength=6)
    odd = present[_OTHER] > 0 or (kind != "f" and present[_DOT] + present[_EXPONENT] > 0)
    if not odd and kind == "u" and present[_SIGN]:
        odd = b"-" in window
    if odd or not _grammar(classes):
        _find_fault(name, window, what, kind)


def _grammar(classes: npt.NDArray[np.uint8]) -> bool:
    """True where all neighbours fit: one dot at most, before the exponent; sign in front."""
    around = np.concatenate(([_SPACE], classes, [_SPACE])).astype(np.uint8)
    if not _PAIRS[6 * around[:-1] + around[1:]].all():
        return False
    dots = np.flatnonzero(around == _DOT)
    if not ((around[dots - 1] == _DIGIT) | (around[dots + 1] == _DIGIT)).all():
        return False
    marks = around[(around == _SPACE) | (around == _DOT) | (around == _EXPONENT)]
    first, second = marks[:-1], marks[1:]
    return not ((first == _EXPONENT) & (second != _SPACE) | (first == _DOT) & (second == _DOT)).any()


def _find_fault(name: str, window: bytes, what: str, kind: str) -> None:
    """Look at every number of a window that has an odd sign in it; raise at the first that is none."""
    for text in dict.fromkeys(window.split()):
        word = kind == "f" and _WORD.fullmatch(text)
        whole = _NUMBER.fullmatch(text) and (kind == "f" or text.lstrip(b"+-" if kind == "i" else b"+").isdigit())
        if not (word or whole):
            shown = text[:30].decode("ascii", "backslashreplace")
            needed = {"f": "number", "i": "whole number", "u": "whole number from 0 up"}[kind]
            raise FileError(name, f"'{shown}' in {what} is no {needed}; the file is damaged, write it anew")
