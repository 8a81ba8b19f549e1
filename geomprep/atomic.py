"""Write a file whole or not at all: a killed run leaves the old file or the new one."""

from __future__ import annotations

import os
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import BinaryIO

from geomprep.errors import InputError

__all__ = ["atomic_writer", "replacing", "write_atomic"]


@contextmanager
def replacing(path: str | Path) -> Iterator[Path]:
    """Give the name of a new file beside `path` that takes its place when the block ends well.

    For writers that want a name. The new file lies in the same folder, is flushed to the
    disk and then renamed, so that at no moment a half-written file bears the final name.
    When the block raises, the new file is removed and the old one stays.

    Parameters
    ----------
    path : str or Path
        Final name.

    Yields
    ------
    Path
        Name to write to, with the same suffix.

    Raises
    ------
    InputError
        The folder is missing or not writable, `path` is a folder, or the disk is full.

    Examples
    --------
    >>> folder = tempfile.mkdtemp()
    >>> with replacing(f"{folder}/note.txt") as new:
    ...     _ = new.write_text("whole")
    >>> os.listdir(folder)
    ['note.txt']
    >>> with replacing("/no/such/folder/note.txt") as new:
    ...     pass
    Traceback (most recent call last):
    geomprep.errors.InputError: /no/such/folder/note.txt: cannot be written: No such file or directory; ...
    """
    final = Path(path)
    new: Path | None = None
    try:
        if final.is_dir():
            raise IsADirectoryError(21, "it is a folder")
        handle, name = tempfile.mkstemp(prefix=f".{final.stem[:40]}-", suffix=final.suffix, dir=final.parent)
        new = Path(name)
        os.close(handle)
        yield new
        _settle(new, final)
    except OSError as error:
        raise InputError(
            f"{path}: cannot be written: {error.strerror or error}; "
            "choose a folder that exists, may be written and has room"
        ) from error
    finally:
        if new is not None:
            new.unlink(missing_ok=True)


def _settle(new: Path, final: Path) -> None:
    """Bring the new file to the disk, give it the usual rights and the final name."""
    mask = os.umask(0)
    os.umask(mask)
    new.chmod(0o666 & ~mask)
    with new.open("rb") as stream:
        os.fsync(stream.fileno())
    new.replace(final)


@contextmanager
def atomic_writer(path: str | Path) -> Iterator[BinaryIO]:
    """Give a stream whose content takes the place of `path` when the block ends well.

    Parameters
    ----------
    path : str or Path
        Final name.

    Yields
    ------
    BinaryIO
        Stream open for writing bytes.

    Raises
    ------
    InputError
        The folder is missing or not writable, `path` is a folder, or the disk is full.

    Examples
    --------
    >>> folder = tempfile.mkdtemp()
    >>> with atomic_writer(f"{folder}/note.txt") as stream:
    ...     _ = stream.write(b"whole")
    >>> Path(folder, "note.txt").read_bytes()
    b'whole'
    """
    with replacing(path) as new, new.open("wb") as stream:
        yield stream


def write_atomic(path: str | Path, data: bytes | str) -> None:
    """Write bytes (or text as UTF-8) to a file whole or not at all.

    Parameters
    ----------
    path : str or Path
        File to make or to replace; its folder must exist.
    data : bytes or str
        New content of the whole file.

    Raises
    ------
    InputError
        The folder is missing or not writable, `path` is a folder, or the disk is full.

    Examples
    --------
    >>> folder = tempfile.mkdtemp()
    >>> write_atomic(f"{folder}/empty.txt", "")
    >>> Path(folder, "empty.txt").read_bytes()
    b''
    """
    with atomic_writer(path) as stream:
        stream.write(data.encode() if isinstance(data, str) else data)
