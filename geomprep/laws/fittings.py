"""Loss of pressure of a narrowing that replaces its stretch: Δp = R_v Q + K Q|Q| + L dQ/dt.

:data:`LAWS` is the closed table of laws. A :class:`Loss` also holds what of the segment's own values it stands
for: with the fitting in place the segment keeps its resistance and inertance less those, and nothing is counted
twice. Δp is a loss of total pressure; between places of equal area the static pressure falls by the same.
Published values come from the caller, by the keys of the literature rows that a law names.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, fields, replace
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt

from geomprep.errors import InputError
from geomprep.laws.arrays import FloatArray, positive

__all__ = ["LAWS", "Law", "Limit", "Loss", "Narrowing", "Spread", "borda_carnot", "dynamic_pressure"]
__all__ += ["friction_alone", "loss_by", "pressure_loss", "range_texts", "spread", "young_tsai"]


@dataclass(frozen=True, eq=False)
class Narrowing:
    """Stretches that fittings replace, (k,) float arrays; a single number stands for every row.

    A value that is not above zero, or a throat wider than the vessel beside it, raises InputError.

    Attributes
    ----------
    length, area_before, area_throat, area_beyond : array
        Of the stretch, m; lumen of the normal vessel upstream, narrowest place and normal vessel downstream, m².
    friction, inertance : array
        What the stretch has by itself, Pa·s/m³ and Pa·s²/m³: Poiseuille's integral with the profile and
        outline of the segment, and ρ∫ds/A (:mod:`geomprep.laws.lumped`).

    Examples
    --------
    >>> Narrowing(0.01, 4e-6, [1e-6, 2e-6], 4e-6, 1e8, 1e6).degree_by_area
    array([0.75, 0.5 ])
    """

    length: FloatArray
    area_before: FloatArray
    area_throat: FloatArray
    area_beyond: FloatArray
    friction: FloatArray
    inertance: FloatArray

    def __post_init__(self) -> None:
        columns = {field.name: positive(field.name, getattr(self, field.name)).ravel() for field in fields(self)}
        counts = {array.size for array in columns.values()} - {1}
        if len(counts) > 1:
            held = ", ".join(f"{name} {array.size}" for name, array in columns.items())
            raise InputError(f"narrowings need as many values in every column, or one for all; there are {held}")
        for name, array in columns.items():
            object.__setattr__(self, name, np.broadcast_to(array, max(counts, default=1)))
        beside = np.minimum(self.area_before, self.area_beyond)
        wide = np.flatnonzero(self.area_throat > beside)
        if wide.size:
            raise InputError(
                f"area_throat = {self.area_throat[wide[0]]:g} m2 (number {wide[0]}) is wider than area_before or "
                f"area_beyond = {beside[wide[0]]:g} m2: no narrowing; leave the stretch to its segment"
            )

    @property
    def degree_by_area(self) -> FloatArray:
        """1 − throat/before."""
        return np.asarray(1 - self.area_throat / self.area_before)

    def turned(self) -> Narrowing:
        """Return the same narrowings for blood that runs the other way."""
        return replace(self, area_before=self.area_beyond, area_beyond=self.area_before)


@dataclass(frozen=True, eq=False)
class Loss:
    """Coefficients of Δp = R_v Q + K Q|Q| + L dQ/dt, (k,) float arrays.

    K is that of positive flow. Where the vessel is not as wide beyond as before, reversed flow needs the loss of
    :meth:`Narrowing.turned`.

    Attributes
    ----------
    viscous, quadratic, inertial : array
        R_v in Pa·s/m³, friction of the stretch included; K in Pa·s²/m⁶; L in Pa·s²/m³, zero where the law has none.
    replaced_friction, replaced_inertance : array
        Poiseuille part of the stretch that R_v stands for, and its inertance that L stands for (zero where the
        law has none), to be left out of the segment, Pa·s/m³ and Pa·s²/m³.
    """

    viscous: FloatArray
    quadratic: FloatArray
    inertial: FloatArray
    replaced_friction: FloatArray
    replaced_inertance: FloatArray


def young_tsai(
    narrowing: Narrowing,
    density: float,
    viscosity: float,
    *,
    length_share: float,
    diameter_share: float,
    expansion: float,
    inertia: float,
) -> Loss:
    """Return the loss by Young and Tsai, fitted to models of arteries and tried in dogs.

    With U and D₀ of the vessel before the narrowing and D = √(4A/π),

        Δp = K_v (μ/D₀) U + K_t (ρ/2)(A₀/A_s − 1)² U|U| + K_u ρ l dU/dt,
        K_v = 32 (l_a/D₀)(A₀/A_s)²,  l_a = length_share·l + diameter_share·D_s.

    K_v is Poiseuille's friction in a throat of length l_a, R_v = 8πμ l_a/A_s². It stands for the friction of
    the whole stretch, K_u for its inertance.

    Sources: Young & Tsai 1973, doi 10.1016/0021-9290(73)90099-7 (steady), 10.1016/0021-9290(73)90012-2 (unsteady);
    Seeley & Young 1976, doi 10.1016/0021-9290(76)90086-5 (l_a).

    Parameters
    ----------
    narrowing : Narrowing
    density, viscosity : float
        ρ in kg/m³ and μ in Pa·s.
    length_share, diameter_share, expansion, inertia : float
        Constants of l_a, K_t and K_u; pure numbers, above zero as all else (else InputError).

    Examples
    --------
    >>> stretch = Narrowing(1.0, 2.0, 1.0, 2.0, 1.0, 1.0)
    >>> loss = young_tsai(stretch, 2.0, 1.0, length_share=0.9, diameter_share=0.1, expansion=1.0, inertia=1.0)
    >>> float(loss.quadratic[0]), float(loss.inertial[0])
    (0.25, 1.0)
    """
    rho, throat = positive("density", density), narrowing.area_throat
    reach = positive("length_share", length_share) * narrowing.length
    reach = reach + positive("diameter_share", diameter_share) * np.sqrt(4 * throat / np.pi)
    return Loss(
        8 * np.pi * positive("viscosity", viscosity) * reach / throat**2,
        positive("expansion", expansion) * rho / 2 * (1 / throat - 1 / narrowing.area_before) ** 2,
        positive("inertia", inertia) * rho * narrowing.length / narrowing.area_before,
        narrowing.friction,
        narrowing.inertance,
    )


def borda_carnot(narrowing: Narrowing, density: float) -> Loss:
    """Return the friction of the stretch and the loss of a sudden expansion, K = (ρ/2)(1/A_s − 1/A₂)².

    Momentum of flat profiles, with the throat's pressure on the whole area A₂ beyond, gives
    p₂ − p_s = ρU₂(U_s − U₂); so (ρ/2)(U_s − U₂)² of the total pressure is lost. The contraction is taken to lose
    nothing. `density` is ρ in kg/m³.

    Examples
    --------
    >>> float(borda_carnot(Narrowing(1.0, 2.0, 1.0, 2.0, 1.0, 1.0), 2.0).quadratic[0])
    0.25
    """
    lost = 1 / narrowing.area_throat - 1 / narrowing.area_beyond
    return _with_friction(narrowing, positive("density", density) / 2 * lost**2)


def dynamic_pressure(narrowing: Narrowing, density: float) -> Loss:
    """Return the friction of the stretch and the whole dynamic pressure of the throat, K = ρ/(2 A_s²).

    Nothing is recovered beyond. No bound of every law: Young and Tsai lose more where K_t (1 − A_s/A₀)² > 1.
    `density` is ρ in kg/m³.

    Examples
    --------
    >>> float(dynamic_pressure(Narrowing(1.0, 2.0, 1.0, 2.0, 1.0, 1.0), 2.0).quadratic[0])
    1.0
    """
    return _with_friction(narrowing, positive("density", density) / 2 / narrowing.area_throat**2)


def friction_alone(narrowing: Narrowing) -> Loss:
    """Return the friction of the stretch and nothing else: what the segment has without a fitting.

    Examples
    --------
    >>> float(friction_alone(Narrowing(1.0, 2.0, 1.0, 2.0, 7.0, 1.0)).viscous[0])
    7.0
    """
    return _with_friction(narrowing, np.zeros_like(narrowing.length))


def _with_friction(narrowing: Narrowing, quadratic: FloatArray) -> Loss:
    """Loss of the friction of the stretch itself and a quadratic term; the inertance stays with the segment."""
    none = np.zeros_like(narrowing.length)
    return Loss(narrowing.friction, quadratic, none, narrowing.friction, none)


class Limit(NamedTuple):
    """Interval of a quantity that a law was tested on: keys of literature rows, an empty one leaves an end open."""

    quantity: str
    least: str
    most: str
    why: str


@dataclass(frozen=True)
class Law:
    """One law of the loss of a narrowing.

    Attributes
    ----------
    equation, source : str
        The law as text, as it stands in the network file; its citation.
    function : callable
        ``function(narrowing, **parameters) -> Loss``.
    parameters, published : tuple of str, tuple of (str, str)
        What `function` takes beside the narrowing; of which a literature row holds the value, with its key.
    vessel_class, limits : str, tuple of Limit
        Class in which the law was tested (``any`` where it is physics of pipes), and further limits.
    """

    equation: str
    source: str
    function: Callable[..., Loss]
    parameters: tuple[str, ...] = ()
    published: tuple[tuple[str, str], ...] = ()
    vessel_class: str = "any"
    limits: tuple[Limit, ...] = ()


_DEGREE, _BEFORE, _THROAT = "degree by area", "Reynolds number before", "Reynolds number in the throat"
LAWS: Final[dict[str, Law]] = {
    "Young and Tsai": Law(
        "dp = R_v Q + K Q|Q| + L dQ/dt, R_v = 8 pi mu (length_share l + diameter_share D_s)/A_s^2, "
        "K = expansion rho/2 (1/A_s - 1/A_0)^2, L = inertia rho l/A_0",
        "Young & Tsai 1973, doi 10.1016/0021-9290(73)90099-7, 10.1016/0021-9290(73)90012-2; "
        "Seeley & Young 1976, doi 10.1016/0021-9290(76)90086-5",
        young_tsai,
        ("density", "viscosity", "length_share", "diameter_share", "expansion", "inertia"),
        (
            ("length_share", "narrowing-length-share-seeley-young-1976"),
            ("diameter_share", "narrowing-diameter-share-seeley-young-1976"),
            ("expansion", "narrowing-expansion-young-tsai-1973"),
            ("inertia", "narrowing-inertia-young-tsai-1973"),
        ),
        "artery",
        (
            Limit(_DEGREE, "narrowing-least-degree-dogs", "narrowing-most-degree-dogs", "tried in arteries of dogs"),
            Limit(_BEFORE, "narrowing-least-reynolds", "narrowing-most-reynolds", "later comparisons of such laws"),
        ),
    ),
    "Borda-Carnot": Law(
        "dp = R_v Q + K Q|Q|, R_v = friction of the stretch, K = rho/2 (1/A_s - 1/A_2)^2",
        "sudden expansion, Rennels & Hudson 2012, Pipe Flow, Wiley",
        borda_carnot,
        ("density",),
        limits=(
            Limit(_THROAT, "expansion-laminar-reynolds-hooper-1988", "", "flat profiles; a laminar jet loses more"),
        ),
    ),
    "dynamic pressure": Law(
        "dp = R_v Q + K Q|Q|, R_v = friction of the stretch, K = rho/(2 A_s^2)",
        "Bernoulli's equation up to the throat, nothing recovered beyond",
        dynamic_pressure,
        ("density",),
    ),
    "friction alone": Law(
        "dp = R_v Q, R_v = friction of the stretch",
        "Poiseuille's law integrated over the stretch",
        friction_alone,
        limits=(Limit(_THROAT, "", "pipe-laminar-reynolds", "laminar flow in a straight pipe"),),
    ),
}
"""Name of each law -> its equation, source, function, parameters and limits."""


def _law(name: str) -> Law:
    """Law of a name, or a line with the names there are."""
    if name not in LAWS:
        raise InputError(f"law of narrowings '{name}' is unknown; choose one of {', '.join(LAWS)}")
    return LAWS[name]


def loss_by(name: str, narrowing: Narrowing, density: float, viscosity: float, published: Mapping[str, float]) -> Loss:
    """Return the loss by the law of a name; ρ in kg/m³, μ in Pa·s, `published` values of literature rows by key.

    Raises InputError where the law is unknown or a value that it needs is missing.

    Examples
    --------
    >>> float(loss_by("friction alone", Narrowing(1.0, 2.0, 1.0, 2.0, 7.0, 1.0), 1060.0, 3.5e-3, {}).viscous[0])
    7.0
    """
    law = _law(name)
    known = {"density": density, "viscosity": viscosity}
    known |= {parameter: _value(key, published) for parameter, key in law.published}
    return law.function(narrowing, **{parameter: known[parameter] for parameter in law.parameters})


def _value(key: str, published: Mapping[str, float]) -> float:
    """One published value, or a line that names its key."""
    if key not in published:
        raise InputError(f"the value of '{key}' is missing: this law of narrowings needs it from the literature table")
    return published[key]


def pressure_loss(loss: Loss, flow: npt.ArrayLike, flow_rate: npt.ArrayLike = 0.0) -> FloatArray:
    """Return R_v Q + K Q|Q| + L dQ/dt in Pa, shape (..., k); Q in m³/s and dQ/dt in m³/s² broadcast to it.

    Examples
    --------
    >>> one = np.ones(1)
    >>> pressure_loss(Loss(one, 2 * one, 3 * one, one, one), [[2.0], [-2.0]], 1.0).ravel()
    array([13., -7.])
    """
    q = np.asarray(flow, dtype=np.float64)
    return np.asarray((loss.viscous + loss.quadratic * np.abs(q)) * q + loss.inertial * np.asarray(flow_rate))


class Spread(NamedTuple):
    """Steady |Δp| by several laws: the largest and the law that gives it (the first at no flow), largest less smallest."""

    largest: FloatArray
    largest_by: tuple[str, ...]
    spread: FloatArray


def spread(losses: Mapping[str, Loss], flow: npt.ArrayLike) -> Spread:
    """Return the largest steady loss of each narrowing among laws and how far they lie apart, Pa.

    `losses` are those of the same k narrowings by name of the law, at least one (else InputError); `flow` is in m³/s.

    Examples
    --------
    >>> stretch = Narrowing(1.0, 2.0, 1.0, 2.0, 7.0, 1.0)
    >>> both = {"friction alone": friction_alone(stretch), "dynamic pressure": dynamic_pressure(stretch, 2.0)}
    >>> spread(both, -3.0)
    Spread(largest=array([30.]), largest_by=('dynamic pressure',), spread=array([9.]))
    """
    if not losses:
        raise InputError(f"no law of narrowings to compare; give losses by some of {', '.join(LAWS)}")
    drops = np.abs(np.stack([pressure_loss(loss, flow) for loss in losses.values()]))
    by = [list(losses)[row] for row in drops.argmax(axis=0).tolist()]
    return Spread(drops.max(axis=0), tuple(by), np.ptp(drops, axis=0))


def _reynolds_number(flow: FloatArray, area: FloatArray, density: float, viscosity: float) -> FloatArray:
    """ρ|U|D/μ with U = Q/A and D = √(4A/π)."""
    momentum = positive("density", density) * np.abs(flow) / area * np.sqrt(4 * area / np.pi)
    return np.asarray(momentum / positive("viscosity", viscosity))


def range_texts(
    name: str,
    narrowing: Narrowing,
    flow: npt.ArrayLike,
    density: float,
    viscosity: float,
    vessel_class: str,
    published: Mapping[str, float],
) -> tuple[tuple[str, ...], ...]:
    """Say for each narrowing, in clauses for a finding, where a law is used outside what it was tested on.

    Flow is (k,) in m³/s, all else as in :func:`loss_by`; `published` has the rows that the limits name.

    Examples
    --------
    >>> limit = {"pipe-laminar-reynolds": 2000.0}
    >>> range_texts("friction alone", Narrowing(1.0, 4.0, 1.0, 4.0, 1.0, 1.0), 3.0, 1e3, 1.0, "vein", limit)
    (('Reynolds number in the throat 3385 lies above 2000 (laminar flow in a straight pipe)',),)
    """
    law, flows = _law(name), np.broadcast_to(np.asarray(flow, dtype=np.float64), narrowing.length.shape)
    here = {
        _DEGREE: narrowing.degree_by_area,
        _BEFORE: _reynolds_number(flows, narrowing.area_before, density, viscosity),
        _THROAT: _reynolds_number(flows, narrowing.area_throat, density, viscosity),
    }
    own = f"'{name}' was tested in vessels of class {law.vessel_class}; this one is of class {vessel_class}"
    first = () if law.vessel_class in ("any", vessel_class) else (own,)
    columns = [[_outside(limit, value, published) for value in here[limit.quantity].tolist()] for limit in law.limits]
    rows = zip(*columns, strict=True) if columns else [()] * len(flows)
    return tuple((*first, *filter(None, row)) for row in rows)


def _outside(limit: Limit, value: float, published: Mapping[str, float]) -> str:
    """One clause where a value lies outside a limit, else nothing."""
    low = _value(limit.least, published) if limit.least else -np.inf
    high = _value(limit.most, published) if limit.most else np.inf
    if not (value < low or value > high):
        return ""
    side, end = ("below", low) if value < low else ("above", high)
    return f"{limit.quantity} {value:.4g} lies {side} {end:g} ({limit.why})"
