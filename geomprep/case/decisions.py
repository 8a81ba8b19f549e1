"""Decisions of people: an append-only file beside the case; the last entry on an id wins."""

from __future__ import annotations

import tomllib
from pathlib import Path

from geomprep.atomic import write_atomic
from geomprep.errors import InputError
from geomprep.model import Decision

__all__ = ["DECISIONS_FILE", "WITHDRAWN", "append_decision", "read_decisions", "standing"]

DECISIONS_FILE = "decisions.toml"
"""Name of the file, in the folder of the case."""

WITHDRAWN = "withdrawn"
"""Choice that takes earlier decisions on an id back."""

_HEAD = "# Decisions on this case, oldest first; the last one on an id counts. Written by `geomprep decide`.\n"
_KEYS = ("id", "choice", "note", "recorded_by")


def read_decisions(folder: Path) -> tuple[Decision, ...]:
    """Read every entry of the decisions file of a case, oldest first.

    Parameters
    ----------
    folder : Path
        Folder of the case file.

    Returns
    -------
    tuple of Decision
        Empty where there is no file.

    Raises
    ------
    InputError
        The file is no TOML, or an entry lacks a key or has one too many.

    Examples
    --------
    >>> read_decisions(Path("no-such-folder"))
    ()
    """
    file = folder / DECISIONS_FILE
    try:
        document = tomllib.loads(file.read_text(encoding="utf-8"))
    except FileNotFoundError:
        return ()
    except (OSError, UnicodeDecodeError, tomllib.TOMLDecodeError) as fault:
        raise InputError(f"{DECISIONS_FILE}: cannot be read ({fault}); mend it or move it away") from fault
    entries = document.pop("decision", [])
    if document or not isinstance(entries, list):
        raise InputError(f"{DECISIONS_FILE}: only [[decision]] tables are expected; found {', '.join(document)}")
    return tuple(_decision(entry, number) for number, entry in enumerate(entries, 1))


def _decision(entry: object, number: int) -> Decision:
    """One entry, checked."""
    if not isinstance(entry, dict) or set(entry) != set(_KEYS) or not all(isinstance(v, str) for v in entry.values()):
        raise InputError(f"{DECISIONS_FILE}, entry {number}: the text keys {', '.join(_KEYS)} are needed, no others")
    return Decision(**entry)


def standing(decisions: tuple[Decision, ...]) -> dict[str, Decision]:
    """Return the decision that counts for each id, withdrawn ones left out.

    Examples
    --------
    >>> first = Decision("gap-1", "join", "seen on the image", "A, radiologist")
    >>> list(standing((first, Decision("gap-1", WITHDRAWN, "", "A, radiologist"))))
    []
    """
    last = {decision.id: decision for decision in decisions}
    return {key: decision for key, decision in last.items() if decision.choice != WITHDRAWN}


def append_decision(folder: Path, decision: Decision) -> None:
    """Add an entry at the end of the decisions file; earlier ones are kept as they are.

    Parameters
    ----------
    folder : Path
        Folder of the case file.
    decision : Decision

    Raises
    ------
    InputError
        The present file cannot be read, or the folder cannot be written.
    """
    read_decisions(folder)
    file = folder / DECISIONS_FILE
    before = file.read_bytes() if file.exists() else _HEAD.encode()
    lines = "".join(f"{key} = {_quoted(getattr(decision, key))}\n" for key in _KEYS)
    write_atomic(file, before + f"\n[[decision]]\n{lines}".encode())


def _quoted(text: str) -> str:
    """A TOML basic string on one line."""
    escapes = {"\\": "\\\\", '"': '\\"', "\n": "\\n", "\r": "\\r", "\t": "\\t"}
    inner = "".join(
        escapes.get(sign, sign if ord(sign) >= 32 and ord(sign) != 127 else f"\\u{ord(sign):04x}") for sign in text
    )
    return f'"{inner}"'
