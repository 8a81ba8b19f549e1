"""Geometry of each segment from its stations, exact for a piecewise linear radius."""

from __future__ import annotations

import dataclasses

import numpy as np

from geomprep.curves import Pieces, line_sums, piece_integrals, pieces, weighted_median
from geomprep.model import FloatArray, Measures, Network, Stations

__all__ = ["measure_segments"]


def measure_segments(network: Network) -> Network:
    """Add the measures table: length, volume, lateral area, profile integrals, radii, shape.

    Parameters
    ----------
    network : Network

    Returns
    -------
    Network
        With `measures` filled.

    Notes
    -----
    ``radius_for_resistance`` = (mean of r⁻⁴ along the length)^(−1/4): the cylinder of equal length and
    Poiseuille resistance; ``radius_for_volume`` = (mean of r²)^(1/2).
    """
    stations = network.stations
    piece = pieces(stations.offsets)
    step, near, far = _piece_values(stations, piece)
    volume, lateral, inverse_area, inverse_fourth, _ = line_sums(piece_integrals(step, near, far), piece.starts).T
    length = stations.distance[stations.offsets[1:] - 1]
    first, last = stations.offsets[:-1], stations.offsets[1:] - 1
    measures = Measures(
        length=length,
        volume=volume,
        lateral_area=lateral,
        inverse_area=inverse_area,
        inverse_fourth_power=inverse_fourth,
        radius_at_from=stations.radius[first],
        radius_at_to=stations.radius[last],
        radius_for_resistance=(length / inverse_fourth) ** 0.25,
        radius_for_volume=np.sqrt(volume / (np.pi * length)),
        minimum_radius=np.minimum.reduceat(stations.radius, first) if len(first) else np.zeros(0),
        median_radius=weighted_median(0.5 * (near + far), step, piece.starts),
        taper=_taper(stations, piece, length),
        tortuosity=_tortuosity(stations, length),
    )
    return dataclasses.replace(network, measures=measures)


def _piece_values(stations: Stations, piece: Pieces) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Length and both radii of every piece."""
    first = piece.first
    return stations.distance[first + 1] - stations.distance[first], stations.radius[first], stations.radius[first + 1]


def _taper(stations: Stations, piece: Pieces, length: FloatArray) -> FloatArray:
    """Slope of the least-squares line through r(s), weighted by length: ∫(s − L/2) r ds · 12/L³."""
    step, near, far = _piece_values(stations, piece)
    half = np.repeat(0.5 * length, np.diff(stations.offsets) - 1)
    start = stations.distance[piece.first] - half
    end = start + step
    moment = step / 6.0 * (2 * start * near + start * far + end * near + 2 * end * far)
    return line_sums(moment, piece.starts) * 12.0 / length**3


def _tortuosity(stations: Stations, length: FloatArray) -> FloatArray:
    """Length over the straight distance of the ends; 0 where the ends coincide."""
    first, last = stations.offsets[:-1], stations.offsets[1:] - 1
    chord = np.linalg.norm(stations.position[last] - stations.position[first], axis=1)
    return np.where(chord > 1e-9 * length, length / np.where(chord > 0, chord, 1.0), 0.0)
