"""Which end is the parent, and how radii compare: limits of the rule, Murray's exponent, bends."""

import numpy as np
import pytest

from geomprep.errors import InputError
from geomprep.measure.junction_parents import JunctionKind, ParentRule, bends_from_parent, end_pairs, murray, parents


def away(*degrees: float) -> np.ndarray:
    """Unit vectors in a plane."""
    return np.stack((np.cos(np.radians(degrees)), np.sin(np.radians(degrees)), 0 * np.array(degrees)), axis=1)


def chosen(radius: list[float], *degrees: float, rule: ParentRule | None = None) -> tuple[str, list[int]]:
    kind, is_parent = parents(np.array([0, len(radius)]), np.array(radius), away(*degrees), rule or ParentRule())
    return JunctionKind(kind[0]).name, np.flatnonzero(is_parent).tolist()


@pytest.mark.parametrize(
    ("radius", "degrees", "kind", "rows"),
    [
        ([2, 2, 1], (180, 0, 60), "PASSING_PARENT", [0, 1]),  # a side branch
        ([1, 1, 1], (180, 0, 30), "PASSING_PARENT", [0, 1]),  # as wide as its parent, by direction alone
        ([2, 1.9, 0.5], (180, 40, 0), "PASSING_PARENT", [0, 1]),  # a bent parent with a small straight branch
        ([2, 1, 1], (180, 90, -90), "SYMMETRIC", [0]),  # a trunk that ends in a T
        ([1, 1, 1], (180, 30, -30), "SYMMETRIC", [0]),  # a confluence of equals
        ([1, 0.8, 0.8], (180, 30, -40), "PASSING_PARENT", [0, 1]),  # (40² − 30²)/30² = 0.78 leads by more than 0.5
        ([1, 0.8, 0.8], (180, 30, -35), "SYMMETRIC", [0]),  # (35² − 30²)/30² = 0.36 does not
        ([1, 1, 1], (180, 90, 0), "PASSING_PARENT", [0, 2]),  # arms of a T, the third end is the stem
        ([1, 1, 1], (0, 120, 240), "EQUAL_ENDS", []),
        ([2, 1, 1, 1], (180, 30, 0, -30), "PASSING_PARENT", [0, 2]),
        ([2, 1, 1, 1, 1], (180, 30, 10, -10, -30), "SYMMETRIC", [0]),
        ([1, 1, 1, 1], (0, 180, 90, 270), "EQUAL_ENDS", []),  # two straight vessels that touch
        ([2, 1.5, 1.5], (180, 100, -130), "SYMMETRIC", [0]),  # no continuation: all bend by 80° and more
    ],
)
def test_parents(radius, degrees, kind, rows) -> None:
    assert chosen(radius, *degrees) == (kind, rows)


def test_order_of_ends_means_nothing() -> None:
    radius, degrees = np.array([2, 1.9, 0.5, 1.0]), np.array([180, 20, 60, -70])
    expected = set(radius[chosen(radius.tolist(), *degrees)[1]])
    assert expected == {2, 1.9}
    for order in ([3, 2, 1, 0], [1, 3, 0, 2]):
        _, rows = chosen(radius[order].tolist(), *degrees[order])
        assert set(radius[order][rows]) == expected


def test_many_junctions_at_once() -> None:
    kind, is_parent = parents(
        np.array([0, 3, 5, 8]),
        np.array([2, 2, 1, 1, 1, 1, 1, 1.0]),
        away(180, 0, 60, 180, 0, 0, 120, 240),
        ParentRule(),
    )
    assert kind.tolist() == [0, 0, 2]
    assert is_parent.tolist() == [True, True, False, True, True, False, False, False]


def test_pairs_of_a_trunk_and_of_equal_ends() -> None:
    """Branches stand beside the trunk and one another; equal ends leave each of the others."""
    pairs = end_pairs(np.array([0, 3, 6]), np.array([1, 2], np.uint8), np.array([True] + [False] * 5))
    rows = set(zip(*(getattr(pairs, name).tolist() for name in pairs.__dataclass_fields__), strict=True))
    assert rows == {
        *((branch, 0, -1, True, True) for branch in (1, 2)),
        *((a, b, -1, False, False) for a, b in ((1, 2), (2, 1))),
        *((a, b, -1, False, True) for a in (3, 4, 5) for b in (3, 4, 5) if a != b),
    }
    assert (np.diff(pairs.owner) >= 0).all()


@pytest.mark.parametrize(
    ("exponent", "ratio"),
    # symmetric daughters, 2^(−1/x): 2.33, 2.7 and 3 give 0.742681, 0.773584, 0.793701 (derived from the exponents
    # of Nakamura & Awa 2014, doi 10.1002/phy2.236, seen)
    [(2.33, 0.742681), (2.7, 0.773584), (3.0, 0.793701)],
)
def test_murray_exponent_of_equal_daughters(exponent: float, ratio: float) -> None:
    found, residual, area = murray(np.array([2.0, 2 * ratio, 2 * ratio]), np.array([0, 3]))
    assert found[0] == pytest.approx(exponent, abs=2e-5)  # six digits of the ratio
    assert residual[0] == pytest.approx(1 - 2 * ratio**3, rel=1e-12, abs=1e-12)
    assert area[0] == pytest.approx(2 * ratio**2, rel=1e-12)


def test_murray_exponent_of_three_daughters_and_of_none() -> None:
    """1 = Σ(1/2)^x over 8 daughters has x = 3, over one daughter x = 0; a second end of 1 has none."""
    found, *_ = murray(np.array([1.0] + [0.5] * 8 + [1.0, 0.5, 1.0, 1.0, 0.5]), np.array([0, 9, 11, 14]))
    assert found[:2] == pytest.approx([3, 0], abs=1e-9)
    assert np.isnan(found[2])


def test_bends() -> None:
    """60° from the way on is 60°; against the way on it is measured from the other arm of the parent."""
    is_parent = np.array([True, True, False, False, True, False])
    angle = bends_from_parent(away(180, 0, 60, 150, 180, 150), is_parent, np.array([0, 4, 6]))
    assert np.degrees(angle) == pytest.approx([np.nan, np.nan, 60, 30, np.nan, 150], nan_ok=True)
    small = bends_from_parent(away(180, 0, 1e-7), np.array([True, True, False]), np.array([0, 3]))
    assert np.degrees(small[2]) == pytest.approx(1e-7, rel=1e-6)


@pytest.mark.parametrize(
    "wrong", [{"angle_scale": 0.0}, {"radius_scale": 1.0}, {"clear_by": -1.0}, {"worst": np.inf}, {"least_radius": 2.0}]
)
def test_rule_out_of_range(wrong: dict[str, float]) -> None:
    with pytest.raises(InputError, match=next(iter(wrong))):
        ParentRule(**wrong)
