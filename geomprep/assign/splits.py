"""How a total flow is shared among outlets: one row per rule."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np

from geomprep.errors import CaseError
from geomprep.laws.splits import radius_power_shares
from geomprep.literature import row
from geomprep.model import FloatArray

__all__ = ["SPLIT_RULES", "Unshared", "exponent_value", "outlet_shares"]

_WHOLE = 1e-6


@dataclass(frozen=True, eq=False)
class Unshared:
    """Outlets whose share the case does not state.

    Attributes
    ----------
    radius : (u,) float array
        Median radius of the segment that ends at each, m.
    exponent : float, optional
    labels : tuple of str
    """

    radius: FloatArray
    exponent: float | None
    labels: tuple[str, ...]


def _by_shares(left: Unshared) -> FloatArray:
    """The one outlet without a share takes the rest."""
    if len(left.labels) > 1:
        raise CaseError(
            f"calibration.split = 'shares': {len(left.labels)} outlets state neither share nor mean_flow "
            f"({', '.join(left.labels[:6])}); only one may take the rest"
        )
    return np.ones(len(left.labels))


def _by_radius_power(left: Unshared) -> FloatArray:
    """r^k over the sum of all r^k."""
    if left.exponent is None:
        raise CaseError("calibration.exponent: missing; split = 'radius power' needs it, e.g. exponent = 3")
    return radius_power_shares(left.radius, left.exponent)


SPLIT_RULES: Final[dict[str, Callable[[Unshared], FloatArray]]] = {
    "shares": _by_shares,
    "radius power": _by_radius_power,
}
"""Rule of ``calibration.split`` -> how the flow that is left is divided over the outlets that state none."""


def exponent_value(exponent: float | str | None) -> tuple[float | None, str]:
    """Return an exponent and the key of the literature row it comes from, empty for a stated number.

    Raises
    ------
    InputError
        No row has this key.
    CaseError
        The row holds no plain number.

    Examples
    --------
    >>> exponent_value(2.5)
    (2.5, '')
    >>> exponent_value("radius-power-murray-1926")
    (3.0, 'radius-power-murray-1926')
    """
    if not isinstance(exponent, str):
        return exponent, ""
    found = row(exponent)
    if found.value is None or found.quantity != "number":
        raise CaseError(f"calibration.exponent = '{exponent}': that row holds no exponent of a radius")
    return found.value, exponent


def outlet_shares(stated: FloatArray, rule: str, left: Unshared) -> FloatArray:
    """Complete the shares of the total flow.

    Parameters
    ----------
    stated : (c,) float array
        Share of each outlet; NaN where the case states none.
    rule : str
        A key of :data:`SPLIT_RULES`.
    left : Unshared
        The outlets without a share, in order.

    Returns
    -------
    (c,) float array
        All above zero; their sum is 1 within 1e-6.

    Raises
    ------
    CaseError
        The rule is unknown or lacks a number, the shares do not add up to 1, or nothing is left
        for an outlet.

    Examples
    --------
    >>> outlet_shares(np.array([0.25, np.nan]), "shares", Unshared(np.array([1e-3]), None, ("a",)))
    array([0.25, 0.75])
    """
    if rule not in SPLIT_RULES:
        raise CaseError(f"calibration.split = '{rule}': no rule known here; choose one of {', '.join(SPLIT_RULES)}")
    open_rows = np.isnan(stated)
    rest = 1.0 - float(stated[~open_rows].sum())
    if not open_rows.any():
        if abs(rest) > _WHOLE:
            raise CaseError(
                f"outlets: the shares add up to {1.0 - rest:.6g}; they must add up to 1, or one outlet may "
                "state none and take the rest"
            )
        return stated
    if rest <= _WHOLE:
        raise CaseError(
            f"outlets: the stated shares and flows take {1.0 - rest:.6g} of the total flow; nothing is left for "
            f"{', '.join(left.labels[:6])}"
        )
    shares = stated.copy()
    shares[open_rows] = rest * SPLIT_RULES[rule](left)
    return shares
