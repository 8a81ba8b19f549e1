"""Which wall setting holds for which segments."""

from __future__ import annotations

import difflib
from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from geomprep.errors import InputError
from geomprep.literature import Row, row
from geomprep.model import VESSEL_CLASSES, BoolArray, Segments

__all__ = ["DEFAULT_STIFFNESS", "WallSettings", "WallUse", "wall_uses"]

DEFAULT_STIFFNESS: Final = {"artery": "wave-speed-reymond-2009"}
"""Literature key of the stiffness of each class where none is stated; veins have none that is surely known."""

_EXPONENTS: Final = {"artery": "artery-exponents-formaggia-2003", "vein": "vein-exponents-brook-1999"}
_REFERENCE_STATE: Final = {"artery": "imaged", "vein": "buckling"}
_CLASS_OF_STATE: Final = {"imaged": "artery", "buckling": "vein"}
_NAMED_CLASSES: Final = ("artery", "vein")
_SHOWN: Final = 5


@dataclass(frozen=True)
class WallSettings:
    """How the walls of a vessel class or of one vessel are found, SI.

    Attributes
    ----------
    stiffness : str, optional
        ``user``, or the key of a literature row that gives a wave speed or E h/r0. None means
        ``user`` where a wave speed or Young's modulus is given, else the default of the class.
    wave_speed : float, optional
        m/s, at the imaged state.
    young_modulus, wall_thickness : float, optional
        Pa and m, at the imaged state; for arteries.
    poisson_ratio : float, optional
        Between 0 and 1/2; incompressible (1/2) where not stated.
    reference_state : str, optional
        ``imaged`` or ``buckling``; imaged for arteries and buckling for veins where not stated.
    """

    stiffness: str | None = None
    wave_speed: float | None = None
    young_modulus: float | None = None
    wall_thickness: float | None = None
    poisson_ratio: float | None = None
    reference_state: str | None = None

    @property
    def gives_stiffness(self) -> bool:
        """Whether anything about the stiffness is stated."""
        return any(value is not None for value in (self.stiffness, self.wave_speed, self.young_modulus))


@dataclass(frozen=True, eq=False)
class WallUse:
    """One setting with the segments that it holds for.

    Attributes
    ----------
    key : str
        Table of the case file that gives the stiffness, such as ``walls.vein``.
    settings : WallSettings
        With nothing left open but the numbers that are not needed.
    vessel_class : str
        ``artery`` or ``vein``: which law is used.
    exponents : Row
        Literature row of the exponents of the law.
    segments : (s,) bool array
    """

    key: str
    settings: WallSettings
    vessel_class: str
    exponents: Row
    segments: BoolArray


def wall_uses(segments: Segments, settings: Mapping[str, WallSettings]) -> tuple[WallUse, ...]:
    """Resolve classes, overrides and defaults.

    Parameters
    ----------
    segments : Segments
    settings : mapping
        Settings by ``artery``, ``vein`` or the name (or id) of a vessel. A vessel's settings go
        before those of its class, of which they take over what they leave open.

    Returns
    -------
    tuple of WallUse
        Classes first, then vessels by name; every segment in exactly one.

    Raises
    ------
    InputError
        A name fits no vessel, two fit the same, or segments of unknown class have no settings of
        their own.

    Notes
    -----
    A vessel of unknown class takes the law of its literature row's class, or else of the stated
    reference state: the artery law for ``imaged``, the collapsible one for ``buckling``.
    """
    taken = np.zeros(len(segments), np.bool_)
    own: list[WallUse] = []
    for name in sorted(set(settings) - set(_NAMED_CLASSES)):
        mask = _segments_named(segments, name)
        if (mask & taken).any():
            raise InputError(f'[walls."{name}"] and another table name the same segment; keep one of them')
        taken |= mask
        for code in np.unique(segments.vessel_class[mask]):
            here = mask & (segments.vessel_class == code)
            own.append(_own_use(name, VESSEL_CLASSES[code], settings, here))
    _refuse_unknown(segments, taken)
    classes = [
        _use(f"walls.{name}", settings.get(name, WallSettings()), name, mask)
        for name in _NAMED_CLASSES
        if (mask := (segments.vessel_class == VESSEL_CLASSES.index(name)) & ~taken).any()
    ]
    return (*classes, *own)


def _segments_named(segments: Segments, name: str) -> BoolArray:
    """Segments of a vessel name or id, at least one."""
    mask = np.asarray((segments.name == name) | (segments.id == name), dtype=np.bool_)
    if not mask.any():
        known = sorted({str(vessel) for vessel in segments.name if vessel} | set(_NAMED_CLASSES))
        near = difflib.get_close_matches(name, known, n=3, cutoff=0.0)
        raise InputError(f'[walls."{name}"]: no vessel has this name; the nearest are {", ".join(near)}')
    return mask


def _own_use(name: str, vessel_class: str, settings: Mapping[str, WallSettings], mask: BoolArray) -> WallUse:
    """Settings of one vessel, completed from those of its class."""
    own, key = settings[name], f"walls.{name}"
    if vessel_class == "unknown":
        return _use(key, own, _class_from(key, own), mask)
    general = settings.get(vessel_class, WallSettings())
    if not own.gives_stiffness:
        stated = own.poisson_ratio if own.poisson_ratio is not None else general.poisson_ratio
        state = own.reference_state or general.reference_state
        key, own = f"walls.{vessel_class}", replace(general, poisson_ratio=stated, reference_state=state)
    return _use(key, replace(own, reference_state=own.reference_state or general.reference_state), vessel_class, mask)


def _class_from(key: str, own: WallSettings) -> str:
    """Law for a vessel of unknown class, from what its settings imply."""
    if own.stiffness not in (None, "user") and row(str(own.stiffness)).vessel_class in _NAMED_CLASSES:
        return row(str(own.stiffness)).vessel_class
    if own.reference_state is None:
        raise InputError(
            f"[{key}]: the vessel class is unknown, so that the law is open; set reference_state to imaged (artery "
            "law) or buckling (collapsible vein law)"
        )
    return _CLASS_OF_STATE[own.reference_state]


def _use(key: str, settings: WallSettings, vessel_class: str, mask: BoolArray) -> WallUse:
    """Fill the defaults that follow from the class."""
    state = settings.reference_state or _REFERENCE_STATE[vessel_class]
    if state not in _CLASS_OF_STATE:
        raise InputError(f"[{key}]: reference_state = '{state}'; choose imaged or buckling")
    return WallUse(key, replace(settings, reference_state=state), vessel_class, row(_EXPONENTS[vessel_class]), mask)


def _refuse_unknown(segments: Segments, taken: BoolArray) -> None:
    """Raise where segments of unknown class have no settings of their own."""
    left = np.flatnonzero((segments.vessel_class == 0) & ~taken)
    if left.size:
        shown = ", ".join(str(segments.name[i] or segments.id[i]) for i in left[:_SHOWN])
        more = f" and {left.size - _SHOWN} more" if left.size > _SHOWN else ""
        raise InputError(
            f"{left.size} segment(s) are neither artery nor vein ({shown}{more}): state input vessels or class_array, "
            'or give each a table [walls."name"]'
        )
