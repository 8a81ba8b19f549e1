"""Other stations on the same segments."""

from __future__ import annotations

import dataclasses

import numpy as np

from geomprep.curves import interpolate
from geomprep.errors import InputError
from geomprep.model import Basis, FloatArray, IntArray, Network, Stations, Uint8Array

__all__ = ["resample"]


def resample(network: Network, spacing: float, in_radii: bool = False) -> Network:
    """Place stations at equal distances along every segment.

    Ends stay where they are; radius and position between old stations are linear, so a
    station that falls between two measured ones has the basis ``interpolated``.

    Parameters
    ----------
    network : Network
        Before any table that hangs on stations has been added.
    spacing : float
        Largest distance between stations, in metres, or in median radii of each segment.
    in_radii : bool
        True where `spacing` counts radii.

    Raises
    ------
    InputError
        The spacing is not positive.
    """
    if not spacing > 0:
        raise InputError(f"station_spacing = {spacing}: must be greater than 0; write '0.5 radius' or '0.5 mm'")
    stations = network.stations
    n_lines = len(stations.offsets) - 1
    length = stations.distance[stations.offsets[1:] - 1]
    step = spacing * _middle_radius(stations) if in_radii else np.full(n_lines, spacing)
    count = np.maximum(2, np.ceil(length / step * (1 - 1e-12)).astype(np.int64) + 1)
    offsets = np.concatenate(([0], np.cumsum(count)))
    line = np.repeat(np.arange(n_lines), count)
    at = (np.arange(offsets[-1]) - offsets[line]) / (count[line] - 1) * length[line]
    at[offsets[1:] - 1] = length
    old = (stations.distance, stations.offsets, line, at)
    return dataclasses.replace(
        network,
        stations=Stations(
            offsets=offsets,
            distance=at,
            position=interpolate(old[0], stations.position, *old[1:]),
            radius=interpolate(old[0], stations.radius, *old[1:]),
            basis=_basis_at(stations, *old[1:]),
        ),
    )


def _middle_radius(stations: Stations) -> FloatArray:
    """Median of the stations' radii per segment (the spacing needs no finer value)."""
    order = np.lexsort((stations.radius, stations.segment))
    middle = (stations.offsets[:-1] + stations.offsets[1:] - 1) // 2
    radius: FloatArray = stations.radius[order][middle]
    return radius


def _basis_at(stations: Stations, offsets: IntArray, line: IntArray, at: FloatArray) -> Uint8Array:
    """Basis of a new station: that of an old one at the same place, else interpolated."""
    index = np.arange(len(stations), dtype=np.float64)
    place = interpolate(stations.distance, index, offsets, line, at)
    nearest = np.rint(place).astype(np.int64)
    same = np.abs(place - nearest) < 1e-9
    return np.where(same, stations.basis[nearest], Basis.INTERPOLATED).astype(np.uint8)
