"""The sample cases: where they lie and how one is copied."""

from __future__ import annotations

import shutil
from pathlib import Path

import geomprep
from geomprep.errors import InputError

__all__ = ["copy_sample", "sample_folder", "sample_names"]


def sample_folder() -> Path:
    """Return the folder of the sample cases: inside an installed package, or beside it in a working copy.

    Raises
    ------
    InputError
        The installation has no samples.
    """
    package = Path(geomprep.__file__).parent
    for folder in (package / "samples", package.parent / "sample_geometries"):
        if folder.is_dir():
            return folder
    raise InputError("this installation of geomprep has no sample cases; install it again from a complete package")


def sample_names() -> tuple[str, ...]:
    """Return the names of the sample cases.

    Examples
    --------
    >>> "limb" in sample_names()
    True
    """
    return tuple(sorted(path.parent.name for path in sample_folder().glob("*/case.toml")))


def copy_sample(name: str, folder: str | Path = ".") -> Path:
    """Copy a sample case into a folder of its own name and return its case file.

    Parameters
    ----------
    name : str
        One of :func:`sample_names`.
    folder : str or pathlib.Path
        Where the new folder is made.

    Returns
    -------
    pathlib.Path
        The case file of the copy.

    Raises
    ------
    InputError
        No such sample, or something of this name is there already.
    OSError
        The folder cannot be written.

    Examples
    --------
    >>> copy_sample("knee")
    Traceback (most recent call last):
    geomprep.errors.InputError: sample 'knee': no such sample; choose one of head-arteries, ...
    """
    names = sample_names()
    if name not in names:
        raise InputError(f"sample '{name}': no such sample; choose one of {', '.join(names)}")
    target = Path(folder) / name
    if target.exists():
        raise InputError(f"{target}: is there already; give another folder, or move it away")
    try:
        shutil.copytree(sample_folder() / name, target, ignore=shutil.ignore_patterns("results", "__pycache__"))
    except OSError as error:
        raise InputError(f"{target}: cannot be written ({error.strerror or error})") from None
    return target / "case.toml"
