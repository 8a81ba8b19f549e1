"""The companion of a network file: the stations as a zip of arrays, byte for byte reproducible."""

from __future__ import annotations

import hashlib
import re
import zipfile
from collections.abc import Mapping
from pathlib import Path
from typing import IO, Any, Final

import numpy as np
import numpy.typing as npt

from geomprep.atomic import replacing
from geomprep.errors import NetworkFileError
from geomprep.model import Field, field_tables

__all__ = ["MOST_STATIONS_INSIDE", "companion_fields", "read_companion", "remove_companions", "write_companion"]

MOST_STATIONS_INSIDE: Final = 200_000
"""Stations up to which they stand in the JSON itself."""

_NAME = re.compile(r"stations-[0-9a-f]{16}\.npz")
_LONG_AGO = (1980, 1, 1, 0, 0, 0)  # the earliest time a zip can hold: no clock enters the bytes
_DTYPE: Final[dict[str, np.dtype[Any]]] = {"number": np.dtype("<f8"), "row": np.dtype("<i4")}


def companion_fields() -> tuple[Field, ...]:
    """Return the fields of the stations that a companion holds."""
    return tuple(row for row in field_tables()["stations"].fields if row.in_companion)


def write_companion(folder: Path, stations: Mapping[str, Any]) -> dict[str, Any]:
    """Write the station columns beside the network file and return the block that names them.

    The name holds the start of the SHA-256, so that an old network file and its old
    companion stay a pair until the new network file takes the place of the old one.

    Parameters
    ----------
    folder : Path
        Folder of the network file.
    stations : dict
        Columns by name.

    Returns
    -------
    dict
        file, sha256 and count.

    Raises
    ------
    InputError
        The folder is not writable or full.
    """
    first = folder / "stations.npz"
    with replacing(first) as new:
        _write_zip(new, stations)
        with new.open("rb") as stream:
            digest = hashlib.file_digest(stream, "sha256").hexdigest()
    first.replace(folder / f"stations-{digest[:16]}.npz")
    return {"file": f"stations-{digest[:16]}.npz", "sha256": digest, "count": len(stations["distance"])}


def _write_zip(path: Path, stations: Mapping[str, Any]) -> None:
    """Store each column uncompressed, with nothing of this machine or this hour in it."""
    with zipfile.ZipFile(path, "w", zipfile.ZIP_STORED) as archive:
        for row in companion_fields():
            column = np.ascontiguousarray(stations[row.name], dtype=_DTYPE[row.type])
            member = zipfile.ZipInfo(f"{row.name}.npy", _LONG_AGO)
            member.create_system = 3
            member.external_attr = 0o644 << 16
            member.file_size = column.nbytes  # lets columns of 2 GiB and more be stored
            with archive.open(member, "w") as place:
                np.lib.format.write_array(place, column, allow_pickle=False)


def remove_companions(folder: Path, keep: str | None) -> None:
    """Remove companions of earlier results from the folder of a network file."""
    for path in sorted(folder.glob("stations-*.npz")):
        if _NAME.fullmatch(path.name) and path.name != keep:
            path.unlink(missing_ok=True)


def read_companion(folder: Path, block: Mapping[str, Any]) -> dict[str, npt.NDArray[Any]]:
    """Read the station columns of a companion, checked against the block that names it.

    Parameters
    ----------
    folder : Path
        Folder of the network file.
    block : dict
        file, sha256 and count.

    Returns
    -------
    dict of str to array

    Raises
    ------
    NetworkFileError
        The companion is missing, is not the one named, or does not hold the columns.
    """
    name, path = block["file"], folder / block["file"]
    if not name or Path(name).name != name or name in {".", ".."}:
        raise NetworkFileError(f"'{name}' must be the plain name of a file beside the network file")
    if not path.is_file():
        raise NetworkFileError(f"'{name}' is missing beside the network file; copy it there")
    with path.open("rb") as stream:
        if hashlib.file_digest(stream, "sha256").hexdigest() != block["sha256"]:
            raise NetworkFileError(f"'{name}' has another SHA-256 than the network file says; take the pair as written")
        stream.seek(0)
        try:
            return _columns(stream, block["count"])
        except (OSError, ValueError, KeyError, EOFError, zipfile.BadZipFile) as error:
            raise NetworkFileError(f"'{name}' cannot be read as a zip of arrays: {_one_line(error)}") from error


def _columns(stream: IO[bytes], count: int) -> dict[str, npt.NDArray[Any]]:
    """Columns of the zip, each of the type and shape that the fields table gives."""
    found: dict[str, npt.NDArray[Any]] = {}
    with zipfile.ZipFile(stream) as archive:
        expected = {f"{row.name}.npy" for row in companion_fields()}
        if set(archive.namelist()) != expected:
            raise ValueError(f"it must hold {', '.join(sorted(expected))} and nothing else")
        for row in companion_fields():
            info = archive.getinfo(f"{row.name}.npy")
            shape = (count, *(int(part) for part in row.shape[1:]))
            if info.compress_type != zipfile.ZIP_STORED:
                raise ValueError(f"{row.name} is compressed; columns are stored as they are")
            with archive.open(info) as member:
                column = np.lib.format.read_array(member, allow_pickle=False)
            if column.shape != shape or column.dtype != _DTYPE[row.type]:
                raise ValueError(
                    f"{row.name} is {column.dtype.str} {column.shape}; {_DTYPE[row.type].str} {shape} needed"
                )
            found[row.name] = column
    return found


def _one_line(error: BaseException) -> str:
    """Message without line ends."""
    return " ".join(str(error).split()) or type(error).__name__
