"""Vessels of known geometry, put into masks or spoiled by noise, and how far the kernels of geometry are off.

A vessel runs straight or along an arc of a circle, so that the foot of any voxel on its axis has a closed form.
Where lengths are written as plain numbers they are in mm.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.ndimage import distance_transform_edt, map_coordinates, maximum_filter
from scipy.spatial import cKDTree
from scipy.spatial.transform import Rotation

from geomprep.measure import junction_zones, measure_segments
from geomprep.measure.mask_areas import VoxelGrid, mask_areas
from geomprep.measure.narrowings import Narrowings, narrowings
from geomprep.measure.uncertainty import Interval, Intervals, NoiseSettings, intervals, log_scatter
from geomprep.model import Network, Nodes, Segments, Stations

MM = 1e-3
FORMS = ("Gaussian", "cosine", "unlike sides", "flat throat")
READINGS = ("areas", "areas, weighted", "areas on an axis beside", "distance map", "largest of the distance map")
"""Radii of equal area from a mask, on the true axis, with the distance map as weights, or on an axis off by half a voxel
in each coordinate, smoothly over three radii; distance to the nearest voxel outside, on the axis or the largest about."""
_DENSE = 4001


@dataclass(frozen=True, eq=False)
class Vessel:
    """Radius at distances (k,) along the axis, linear between; radius of its arc, infinite if straight; rotation."""

    distance: np.ndarray
    radius: np.ndarray
    bend: float
    turn: np.ndarray

    @property
    def volume(self) -> float:
        """∫πr² ds."""
        a, b = self.radius[:-1], self.radius[1:]
        return float(np.sum(np.pi * np.diff(self.distance) * (a * a + a * b + b * b) / 3))

    @property
    def inverse_fourth_power(self) -> float:
        """∫ds/r⁴, each piece L(a² + ab + b²)/(3a³b³)."""
        a, b = self.radius[:-1], self.radius[1:]
        return float(np.sum(np.diff(self.distance) * (a * a + a * b + b * b) / (3 * a**3 * b**3)))

    def at(self, distance: np.ndarray) -> np.ndarray:
        """Radius at distances; beyond the ends that of the end."""
        return np.interp(distance, self.distance, self.radius)

    def places(self, distance: np.ndarray) -> np.ndarray:
        """(k, 3) places on the axis."""
        zero = np.zeros_like(distance)
        if np.isinf(self.bend):
            return np.stack((distance, zero, zero), axis=1) @ self.turn.T
        angle = distance / self.bend
        return self.bend * np.stack((np.sin(angle), 1 - np.cos(angle), zero), axis=1) @ self.turn.T

    def feet(self, place: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Distance along the axis of the feet of places (..., 3), and distance from the axis."""
        x, y, z = np.moveaxis(place @ self.turn, -1, 0)
        if np.isinf(self.bend):
            return x, np.hypot(y, z)
        return self.bend * np.arctan2(x, self.bend - y), np.hypot(np.hypot(x, self.bend - y) - self.bend, z)


@dataclass(frozen=True, eq=False)
class Voxels:
    """A vessel in a mask of voxels of an edge in m, and what stations take from it, by reading (:data:`READINGS`)."""

    vessel: Vessel
    voxel: float
    read: dict[str, Stations]

    def error(self, reading: str) -> float:
        """∫ds/r⁴ of a reading over the true one, less 1."""
        read = self.read[reading]
        found = Vessel(read.distance, read.radius, np.inf, np.eye(3)).inverse_fourth_power
        return found / self.vessel.inverse_fourth_power - 1

    def off(self, reading: str) -> np.ndarray:
        """Radius of a reading less the true one at its station, in voxels."""
        true = self.vessel.at(self.read["areas"].distance)
        return (self.read[reading].radius - true) / self.voxel


def shape(form: str, s: np.ndarray, width: float) -> np.ndarray:
    """1 at 0 and nothing far away; `width` is where a Gaussian has fallen to 1/e."""
    if form == "cosine":
        return np.cos(0.5 * np.pi * np.clip(s / (2 * width), -1, 1)) ** 2
    if form == "flat throat":
        return np.exp(-((s / width) ** 6))
    return np.exp(-((s / np.where((form == "unlike sides") & (s > 0), 2 * width, width)) ** 2))


def tapered(rng: np.random.Generator, deep: bool) -> Vessel:
    """A vessel of 1 mm radius at its narrowest that tapers by up to a half, bent in every other case.

    With `deep`, it loses 30 to 60 % of its diameter over a few mm.
    """
    length, taper = rng.uniform(16, 24) * MM, rng.uniform(1, 2)
    s = np.linspace(0, length, _DENSE)
    radius = taper + (1 - taper) * s / length
    if deep:
        place, depth = rng.uniform(0.3, 0.7) * length, rng.uniform(0.3, 0.6)
        radius *= 1 - depth * shape("Gaussian", s - place, rng.uniform(2, 4) * MM)
    radius *= MM / radius.min()
    bend = max(rng.uniform(6, 12) * radius.max(), 0.5 * length) if rng.random() < 0.5 else np.inf
    return Vessel(s, radius, bend, Rotation.random(rng=rng).as_matrix())


def narrowed(rng: np.random.Generator, form: str, length: tuple[float, float]) -> tuple[Vessel, float, float]:
    """A straight vessel with one narrowing, its degree and place; length in radii of the wide end."""
    wide, taper = rng.uniform(1.5, 3) * MM, rng.uniform(0.6, 1)
    whole, depth = wide * rng.uniform(*length), rng.uniform(0.3, 0.8)
    place, width = whole * rng.uniform(0.35, 0.65), wide * rng.uniform(0.9, 1.6)
    s = np.linspace(0, whole, _DENSE)
    radius = wide * (1 + (taper - 1) * s / whole) * (1 - depth * shape(form, s - place, width))
    return Vessel(s, radius, np.inf, Rotation.random(rng=rng).as_matrix()), depth, place


def in_voxels(vessel: Vessel, voxel: float, step: float, rng: np.random.Generator) -> Voxels:
    """Put a vessel into a mask, and read its radii at stations about so far apart.

    The vessel goes on beyond both ends of the axis with the radius it has there.
    """
    length, wide = vessel.distance[-1], vessel.radius.max()
    distance = np.linspace(0, length, round(length / step) + 1)
    places = vessel.places(distance)
    low = places.min(axis=0) - wide - voxel * (2.5 + rng.random(3))
    counts = np.ceil((places.max(axis=0) + wide + 2.5 * voxel - low) / voxel).astype(int) + 1
    sides = [low[k] + voxel * np.arange(counts[k]) for k in range(3)]
    foot, away = vessel.feet(np.stack(np.meshgrid(*sides, indexing="ij"), axis=-1))
    mask = (away <= vessel.at(foot)) & (foot > -wide) & (foot < length + wide)
    beside = places + 0.5 * voxel * smooth_noise(distance, 3 * np.median(vessel.radius), 3, rng, power=2)
    index, depth = ((places - low) / voxel).T, distance_transform_edt(mask) * voxel
    map_radius = map_coordinates(depth, index, order=1)
    ridge = map_coordinates(maximum_filter(depth, 3), index, order=0)
    grid, lines = VoxelGrid(low, np.full(3, voxel), np.eye(3)), np.array([0, len(distance)])
    weights = map_radius.astype(np.float32).astype(float)  # squares of single precision are exact
    ways = ((places, None), (places, weights), (beside, None))
    areas = [mask_areas(mask, grid, axis, lines, weight, 3 * wide).area for axis, weight in ways]
    radii = [
        np.sqrt(np.where(np.isnan(area), np.pi * map_radius**2, area) / np.pi) for area in areas
    ]  # as a build does
    radii += [map_radius, ridge]
    axes = (places, places, beside, places, places)
    read = [stations_of([(axis, r)]) for axis, r in zip(axes, radii, strict=True)]
    return Voxels(vessel, voxel, dict(zip(READINGS, read, strict=True)))


def smooth_noise(
    distance: np.ndarray, reach: float, columns: int, rng: np.random.Generator, power: int = 1
) -> np.ndarray:
    """(k, columns) normal noise of unit variance, correlated by exp(−(distance/reach)^power)."""
    apart = np.abs(distance[:, None] - distance) / reach
    root = np.linalg.cholesky(np.exp(-(apart**power)) + 1e-9 * np.eye(len(distance)))
    return root @ rng.standard_normal((len(distance), columns))


def from_voxels(across: float, first: int, n: int) -> list[Voxels]:
    """Tapered vessels with so many voxels across their narrowest place; every third has a narrowing there."""
    made = []
    for seed in range(first, first + n):
        rng = np.random.default_rng([seed, round(across)])
        made.append(in_voxels(tapered(rng, seed % 3 == 0), 2 * MM / across, 0.5 * MM, rng))
    return made


# ---- narrowings


@dataclass(frozen=True, eq=False)
class Found:
    """Found less true loss of diameter (a part of 1) and place (m) of planted narrowings, nan where missed.

    `beside` counts narrowings and widenings that are none.
    """

    degree: np.ndarray
    place: np.ndarray
    beside: int

    @property
    def missed(self) -> int:
        """Planted ones not found."""
        return int(np.isnan(self.degree).sum())


def _held(found: Narrowings, depth: np.ndarray, place: np.ndarray, near: np.ndarray) -> Found:
    """Hold what was found against what was planted: the nearest narrowing within `near` of its place is it."""
    off = np.where(found.widening, np.inf, np.abs(found.place - place[found.segment]))
    degree, where = np.full((2, len(depth)), np.nan)
    for row in np.argsort(-off, kind="stable").tolist():
        segment = found.segment[row]
        if off[row] <= near[segment]:
            degree[segment] = found.degree_by_diameter[row] - depth[segment]
            where[segment] = found.place[row] - place[segment]
    return Found(degree, where, len(off) - int(np.isfinite(degree).sum()))


def noisy_narrowings(form: str, first: int, n: int, noise: float = 0.02, reach: float = 0.0) -> Found:
    """One planted narrowing per vessel, the radius off by a part `noise` of itself.

    The noise is correlated over `reach` radii; 0 for none between stations, which lie a quarter of a radius apart.
    """
    lines, radii, truth = [], [], []
    for seed in range(first, first + n):
        rng = np.random.default_rng([seed, 31])
        vessel, depth, place = narrowed(rng, form, (24, 40))
        size = vessel.radius[0]
        s = np.linspace(0, vessel.distance[-1], round(4 * vessel.distance[-1] / size) + 1)
        scatter = smooth_noise(s, max(reach, 1e-6) * size, 1, rng)[:, 0]
        lines.append(s)
        radii.append(vessel.at(s) * (1 + noise * scatter))
        truth.append((depth, place, 4 * size))
    offsets = np.cumsum([0, *map(len, lines)])
    return _held(narrowings(np.concatenate(lines), np.concatenate(radii), offsets), *np.array(truth).T)


def voxel_narrowings(across: float, first: int, n: int) -> dict[str, Found]:
    """One planted narrowing per mask, so many voxels across the vessel beside it; by what the radii are read from."""
    made, truth = [], []
    for seed in range(first, first + n):
        rng = np.random.default_rng([seed, 32])
        vessel, depth, place = narrowed(rng, FORMS[seed % 3], (14, 18))
        size = vessel.at(place) / (1 - depth)
        made.append(in_voxels(vessel, 2 * size / across, 0.25 * size, rng))
        truth.append((depth, place, 4 * size))
    found = {}
    for name in READINGS:
        read = [each.read[name] for each in made]
        offsets = np.cumsum([0, *map(len, read)])
        columns = (np.concatenate([getattr(each, what) for each in read]) for what in ("distance", "radius"))
        found[name] = _held(narrowings(*columns, offsets), *np.array(truth).T)
    return found


# ---- intervals


def covered(interval: Interval, truth: np.ndarray) -> float:
    """Share of the intervals that hold the truth."""
    return float(np.mean((interval.low <= truth) & (truth <= interval.high)))


def noisy_intervals(kind: str, first: int, n: int) -> tuple[Intervals, np.ndarray]:
    """Intervals of vessels whose radii (2 to 12 %) and places (0.1 mm) carry the stated noise, and truth (3, n).

    Kinds: ``level``, ``tapered``, ``narrowed``, ``bent``, or ``all``, one after the other.
    """
    kinds = ("level", "tapered", "narrowed", "bent") if kind == "all" else (kind,)
    settings, place = NoiseSettings(), 0.1 * MM
    parts, truth = [], []
    for seed in range(first, first + n):
        rng = np.random.default_rng([seed, 33])
        vessel = _stated(rng, kinds[seed % len(kinds)])
        size = np.median(vessel.radius)
        s = np.linspace(0, vessel.distance[-1], round(2 * vessel.distance[-1] / size) + 1)
        deviation, true = rng.uniform(0.02, 0.12) * size, vessel.at(s)
        noise = smooth_noise(s, settings.correlation_length * size, 4, rng)
        q = settings.common_part
        scatter = np.sqrt(q) * rng.standard_normal() + np.sqrt(1 - q) * noise[:, 0]
        read = true * np.exp(log_scatter(true, deviation) * scatter)
        parts.append((vessel.places(s) + place * noise[:, 1:], read, np.full(len(s), deviation)))
        truth.append((vessel.distance[-1], vessel.volume, vessel.inverse_fourth_power))
    return intervals(stations_of(parts), None, np.concatenate([part[2] for part in parts]), place, settings), np.array(
        truth
    ).T


def _stated(rng: np.random.Generator, kind: str) -> Vessel:
    """A vessel 20 to 50 radii long."""
    length, wide = rng.uniform(20, 50), rng.uniform(1, 3) * MM
    s = np.linspace(0, wide * length, _DENSE)
    radius = wide * (1 - rng.uniform(0.2, 0.5) * (kind == "tapered") * s / s[-1])
    if kind == "narrowed":
        radius = radius * (1 - rng.uniform(0.3, 0.6) * shape("Gaussian", s - 0.5 * s[-1], 2 * wide))
    bend = s[-1] / rng.uniform(1, 3) if kind == "bent" else np.inf
    return Vessel(s, radius, bend, Rotation.random(rng=rng).as_matrix())


def stations_of(parts: list[tuple[np.ndarray, ...]]) -> Stations:
    """Stations of lines, with the lengths of what was read."""
    steps = [np.linalg.norm(np.diff(points, axis=0), axis=1) for points, *_ in parts]
    distance = np.concatenate([np.append(0.0, np.cumsum(step)) for step in steps])
    points, radius = (np.concatenate([part[k] for part in parts]) for k in (0, 1))
    return Stations(np.cumsum([0, *(len(part[1]) for part in parts)]), distance, points, radius, np.zeros(len(radius)))


def voxel_intervals(made: list[Voxels], name: str) -> dict[str, tuple[float, float]]:
    """Coverage and median width (high/low) of volume and ∫ds/r⁴, with the deviations that the voxel sets."""
    found = [intervals(each.read[name], each.voxel) for each in made]
    scores = {}
    for quantity in ("volume", "inverse_fourth_power"):
        rows = [getattr(each, quantity) for each in found]
        one = Interval(*(np.concatenate(column) for column in zip(*rows, strict=True)))
        truth = np.array([getattr(each.vessel, quantity) for each in made])
        scores[quantity] = covered(one, truth), float(np.median(one.high / one.low))
    return scores


# ---- closed forms


def network_of(lines: list[tuple[np.ndarray, np.ndarray]]) -> Network:
    """Lines of places and radii in m that share nodes where their ends coincide."""
    ends = np.concatenate([points[[0, -1]] for points, _ in lines])
    node_at, node = np.unique(ends.round(9), axis=0, return_inverse=True)
    node, flat, zero = node.reshape(-1, 2), np.zeros(len(node_at)), np.zeros(len(lines), int)
    names = [str(k) for k in range(len(lines))]
    segments = Segments(names, names, node[:, 0], node[:, 1], *[zero] * 5)
    nodes = Nodes([str(k) for k in range(len(flat))], node_at, flat, flat, np.arange(len(flat)))
    return Network(nodes, segments, stations_of(lines))


def closed_form_error(form: str, stations: int) -> float:
    """Error of a measured ∫ds/r⁴ for a closed form from 2 mm to 1 mm, or a narrowing by 70 % 10 mm long.

    Cone: L(a² + ab + b²)/(3a³b³). Exponential: L(b⁻⁴ − a⁻⁴)/(4 ln(a/b)). Cosine: r = R(p − q cos θ) with q half of the
    loss and p = 1 − q; ∫₀^π dθ/(p − q cos θ)⁴ = π P₃(z)/(p² − q²)² with z = p/√(p² − q²), P₃ = (5z³ − 3z)/2.
    """
    part, length, a, b = np.linspace(0, 1, stations), 10 * MM, 2 * MM, 1 * MM
    q = 0.35
    z = (1 - q) / np.sqrt(1 - 2 * q)
    radius, exact = {
        "cone": (a + (b - a) * part, length * (a * a + a * b + b * b) / (3 * a**3 * b**3)),
        "exponential": (a * (b / a) ** part, length * (b**-4 - a**-4) / (4 * np.log(a / b))),
        "cosine": (
            a * (1 - q + q * np.cos(2 * np.pi * part)),
            length * (5 * z**3 - 3 * z) / 2 / (a**2 * (1 - 2 * q)) ** 2,
        ),
    }[form]
    measured = measure_segments(network_of([(length * part[:, None] * np.array([1.0, 0, 0]), radius)])).measures
    return float(measured.inverse_fourth_power[0] / exact - 1)


Tube = tuple[np.ndarray, np.ndarray, float]


def y_tube(degrees: float, trunk: float, branch: float, parts: bool) -> tuple[float, float]:
    """Errors of ∫ds/r⁴ of the branches, cut where they leave the trunk, and of the volume of the union.

    A branch leaves a trunk that runs on, after trunk/sin θ; or the trunk parts into two at ±θ, which leave its round
    end after its radius. Branches carry the largest spheres in the union near the junction, as lines from an image do.
    """
    turn = np.radians(degrees) * np.array([1, -1])
    ways = 16 * np.stack((np.cos(turn), np.sin(turn), 0 * turn), axis=1)
    arms = [(ways[0], branch), (ways[1], branch)] if parts else [(ways[0], branch), (np.array([15.0, 0, 0]), trunk)]
    tubes: list[Tube] = [(np.zeros(3), stop, radius) for stop, radius in (*arms, (np.array([-15.0, 0, 0]), trunk))]
    part = np.linspace(0, 1, 65)[:, None]
    plain = [(MM * part * stop, np.full(65, MM * radius)) for _, stop, radius in tubes]
    grown = MM * _largest_spheres(part[:33] * ways[0], tubes)
    seen = [(points, np.append(grown, r[33:]) if k < 1 + parts else r) for k, (points, r) in enumerate(plain)]
    zones, bare = junction_zones(network_of(seen)), junction_zones(network_of(plain))
    left = 16 - (trunk if parts else trunk / np.sin(turn[0]))
    found = zones.inverse_fourth_power_after[: 1 + parts] * MM**3 * branch**4 / left - 1
    volume = sum(np.pi * radius**2 * np.linalg.norm(stop) for _, stop, radius in tubes) - bare.overlap.sum() / MM**3
    return float(found[np.argmax(np.abs(found))]), float(volume / _union(tubes) - 1)


def _inside(points: np.ndarray, tube: Tube, less: float = 0.0) -> np.ndarray:
    """Points within a tube with flat ends."""
    start, stop, radius = tube
    run = stop - start
    along = (points - start) @ run / (run @ run)
    away = np.linalg.norm(points - start - along[:, None] * run, axis=1)
    return (along >= 0) & (along <= 1) & (away <= radius - less)


def _union(tubes: list[Tube], n: int = 1_000_000) -> float:
    """Volume of the union by one random point in each of many cells."""
    corners = np.array([[np.minimum(a, b) - r, np.maximum(a, b) + r] for a, b, r in tubes])
    low, size = corners[:, 0].min(axis=0), np.ptp(corners, axis=(0, 1))
    counts = np.round(size * (n / np.prod(size)) ** (1 / 3)).astype(int)
    cells = np.stack(np.meshgrid(*map(np.arange, counts), indexing="ij"), axis=-1).reshape(-1, 3)
    points = low + (cells + np.random.default_rng(7).random(cells.shape)) / counts * size
    return float(np.any([_inside(points, tube) for tube in tubes], axis=0).mean() * np.prod(size))


def _largest_spheres(points: np.ndarray, tubes: list[Tube], step: float = 0.04) -> np.ndarray:
    """Radius of the largest sphere about points, from places on all outer walls."""
    walls = []
    for own, (start, stop, radius) in enumerate(tubes):
        run = (stop - start) / np.linalg.norm(stop - start)
        s, turn = (
            each.ravel()[:, None]
            for each in np.meshgrid(np.arange(0, 14, step), np.arange(0, 2 * np.pi, step / radius))
        )
        up = np.array([0.0, 0, 1])
        wall = start + s * run + radius * (np.cos(turn) * np.cross(run, up) + np.sin(turn) * up)
        others = [_inside(wall, tube, 1e-9) for k, tube in enumerate(tubes) if k != own]
        walls.append(wall[~np.any(others, axis=0)])
    return np.asarray(cKDTree(np.concatenate(walls)).query(points)[0])
