"""Reading a case file: one TOML file that says everything about a run."""

from __future__ import annotations

import hashlib
import re
import tomllib
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Final

from geomprep.case.keys import Key, key_table, nearest, section_names
from geomprep.case.relations import contradictions
from geomprep.case.sections import (
    AnatomySection,
    BloodSection,
    CalibrationSection,
    Case,
    CaseSection,
    ImagingStateSection,
    InletSection,
    InputStatement,
    JoinSection,
    OutletSection,
    RadiusSection,
    ReplaySection,
    SegmentsSection,
    SurroundingsSection,
    WallsSection,
)
from geomprep.case.values import read_value
from geomprep.errors import CaseError, InputError
from geomprep.repair import STEPS

__all__ = ["read_case"]

_RECORDS: Final[dict[str, type[Any]]] = {
    "case": CaseSection,
    "input[]": InputStatement,
    "imaging_state": ImagingStateSection,
    "repair.join": JoinSection,
    "repair.radius": RadiusSection,
    **{f"repair.{row.name}": row.settings for row in STEPS},
    "repair.replay": ReplaySection,
    "segments": SegmentsSection,
    "anatomy": AnatomySection,
    "walls.*": WallsSection,
    "blood": BloodSection,
    "surroundings.*": SurroundingsSection,
    "inlets[]": InletSection,
    "outlets[]": OutletSection,
    "calibration": CalibrationSection,
}
"""Record made from each section of the table of keys."""


def read_case(path: str | Path) -> Case:
    """Read a case file and return what it says, quantities in SI.

    Parameters
    ----------
    path : str or pathlib.Path
        The TOML file.

    Returns
    -------
    Case

    Raises
    ------
    CaseError
        The file is missing or no TOML, or has unknown keys, bad values or
        contradictions; all of them are listed at once, numbered.

    Examples
    --------
    >>> read_case("no-such-case.toml")
    Traceback (most recent call last):
    geomprep.errors.CaseError: no-such-case.toml: no such file
    """
    file = Path(path)
    data = _bytes(file)
    reading = _Reading(file.parent)
    document = _document(data, file)
    sections = {name: list(reading.sections(name, document)) for name in _RECORDS}
    reading.unknown_sections(document)
    if not sections["input[]"] and not reading.faults:
        reading.faults.append("no [[input]] section; name at least one file with lines")
    if not reading.faults:
        case = _assembled(file, data, sections, reading.stated)
        reading.faults.extend(contradictions(case))
        if not reading.faults:
            return case
    raise CaseError(_one_line(f"{file.name}: {_numbered(reading.faults)}"))


def _bytes(file: Path) -> bytes:
    """The bytes of the file, or why there are none."""
    try:
        return file.read_bytes()
    except FileNotFoundError:
        raise CaseError(f"{file}: no such file") from None
    except IsADirectoryError:
        raise CaseError(f"{file}: a folder; give the case file in it") from None
    except OSError as error:
        raise CaseError(f"{file}: cannot be read ({error.strerror})") from None
    except ValueError as error:  # a name that no system takes
        raise CaseError(_one_line(f"{file}: cannot be read ({error})")) from None


def _document(data: bytes, file: Path) -> dict[str, Any]:
    """The TOML document, or the line of its first fault."""
    try:
        return tomllib.loads(data.decode("utf-8-sig").replace("\r\n", "\n"))
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        raise CaseError(f"{file.name}, line {line}: not UTF-8 text; a case file is a TOML text file") from None
    except (tomllib.TOMLDecodeError, RecursionError, ValueError) as error:
        fault, line = str(error), data.count(b"\n") + 1
        place = re.search(r" \(at (?:line (\d+), column \d+|end of document)\)", fault)
        if place:
            line = int(place[1]) if place[1] else line
            fault = fault.replace(place[0], "")
        raise CaseError(_one_line(f"{file.name}, line {line}: no valid TOML: {fault}")) from None


def _one_line(message: str) -> str:
    """A message without line ends and other signs that do not print, whatever the file holds."""
    return "".join(sign if sign.isprintable() else "�" for sign in " ".join(message.split()))


def _numbered(faults: list[str]) -> str:
    """All faults in one line."""
    if len(faults) == 1:
        return faults[0]
    listed = "; ".join(f"({number}) {fault}" for number, fault in enumerate(faults, 1))
    return f"{len(faults)} faults: {listed}"


@dataclass
class _Reading:
    """Faults and stated keys found on the way through a document."""

    folder: Path
    faults: list[str] = field(default_factory=list)
    stated: set[str] = field(default_factory=set)

    def sections(self, name: str, document: dict[str, Any]) -> Iterator[tuple[str, Any]]:
        """Every section of one name as (its free name, its record)."""
        for path, label, table in self._tables(name, document):
            record = self._record(name, path, table)
            if record is not None:
                yield label, record

    def _tables(self, name: str, document: dict[str, Any]) -> Iterator[tuple[str, str, dict[str, Any]]]:
        """Path, free name and content of every section of one name."""
        found: Any = document
        for step in name.removesuffix("[]").removesuffix(".*").split("."):
            found = found.get(step) if isinstance(found, dict) else None
        plain = name.removesuffix("[]").removesuffix(".*")
        if found is None:
            return
        if name.endswith("[]"):
            if not isinstance(found, list) or not all(isinstance(item, dict) for item in found):
                self.faults.append(f"{plain}: a list of sections; write [[{plain}]] with double brackets")
                return
            yield from ((f"{plain}[{number}]", str(number), table) for number, table in enumerate(found))
        elif name.endswith(".*"):
            yield from self._named(plain, found)
        elif not isinstance(found, dict):
            self.faults.append(f"{plain}: one section; write [{plain}] with single brackets")
        else:
            yield plain, "", found

    def _named(self, plain: str, found: Any) -> Iterator[tuple[str, str, dict[str, Any]]]:
        """Sections with free names."""
        if not isinstance(found, dict):
            self.faults.append(f"{plain}: sections with names; write [{plain}.<name>]")
            return
        for label, table in found.items():
            if isinstance(table, dict):
                yield f"{plain}.{label}", label, table
            else:
                self.faults.append(f"{plain}.{label}: stands outside a named section; write [{plain}.<name>] above it")

    def _record(self, name: str, path: str, table: dict[str, Any]) -> Any:
        """The record of one section; None where a needed key is missing or bad."""
        keys = key_table()[name]
        before = len(self.faults)
        for key in table:
            if key not in keys:
                self.faults.append(_unknown(key, name, path))
        values: dict[str, Any] = {}
        for key, row in keys.items():
            if key in table:
                self.stated.add(f"{path}.{key}")
                self._put(values, table[key], row, path)
            elif row.default == "required":
                self.faults.append(f'{path}.{key}: missing; write e.g. {key} = "{row.example}"')
            elif row.default:
                self._put(values, row.default, row, path)
        if len(self.faults) > before:
            return None
        try:
            return _RECORDS[name](**values)
        except InputError as fault:  # values that do not go together
            self.faults.append(str(fault) if str(fault).startswith(path) else f"{path}: {fault}")
            return None

    def _put(self, values: dict[str, Any], value: Any, row: Key, path: str) -> None:
        """Read one value, or note its fault."""
        try:
            values[row.key] = read_value(value, row, f"{path}.{row.key}", self.folder)
        except CaseError as error:
            self.faults.append(str(error))

    def unknown_sections(self, document: dict[str, Any]) -> None:
        """Note top-level names, and names below [repair], that no section has."""
        plain = [name.removesuffix("[]").removesuffix(".*") for name in key_table()]
        first = list(dict.fromkeys(name.split(".")[0] for name in plain))
        for name, table in document.items():
            if name not in first:
                homes = _homes(name)
                hint = f"a key of {homes}; put it below that line" if homes else nearest(name, first)
                self.faults.append(f"unknown section or key '{name}'; {hint}")
            inner = [known.split(".")[1] for known in plain if known.startswith(f"{name}.")]
            if inner and not isinstance(table, dict):
                self.faults.append(f"{name}: holds sections, such as [{name}.{inner[0]}]")
            elif inner:
                strangers = [key for key in table if key not in inner]
                self.faults += [f"unknown section or key '{name}.{key}'; {nearest(key, inner)}" for key in strangers]


def _homes(key: str) -> str:
    """Sections in which a key is known, as a person writes them."""
    return " or ".join(shown for shown, keys in zip(section_names(), key_table().values(), strict=True) if key in keys)


def _unknown(key: str, name: str, path: str) -> str:
    """Message for an unknown key: the nearest key here, or the section where it belongs."""
    hint = nearest(key, list(key_table()[name]))
    homes = _homes(key)
    if homes and "did you mean" not in hint:
        hint = f"it belongs in {homes}"
    return f"unknown key '{path}.{key}'; {hint}"


def _assembled(file: Path, data: bytes, sections: dict[str, list[tuple[str, Any]]], stated: set[str]) -> Case:
    """The case from its sections."""
    single = {name: found[0][1] for name, found in sections.items() if found}

    def many(name: str) -> tuple[Any, ...]:
        return tuple(record for _, record in sections[name])

    def one(name: str) -> Any:
        return single[name] if name in single else _RECORDS[name]()

    return Case(
        file=file.name,
        folder=file.parent,
        sha256=hashlib.sha256(data).hexdigest(),
        case=one("case"),
        inputs=many("input[]"),
        imaging_state=one("imaging_state"),
        join=one("repair.join"),
        radius=one("repair.radius"),
        steps={row.name: one(f"repair.{row.name}") for row in STEPS},
        replay=one("repair.replay"),
        segments=one("segments"),
        anatomy=one("anatomy"),
        walls=dict(sections["walls.*"]),
        blood=one("blood"),
        surroundings=dict(sections["surroundings.*"]),
        inlets=many("inlets[]"),
        outlets=many("outlets[]"),
        calibration=single.get("calibration"),
        stated=frozenset(stated),
    )
