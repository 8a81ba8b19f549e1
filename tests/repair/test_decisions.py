"""A person's decision goes before the rule, and what was declined stays as drawn."""

import numpy as np
import pytest

from geomprep.errors import InputError
from geomprep.model import Centrelines
from geomprep.repair import Verdict, Verdicts, join


def lines(*parts: np.ndarray, radius: float = 1e-3) -> Centrelines:
    """Arterial lines, each with points of its own, in metres."""
    points = np.concatenate(parts)
    counts = [len(part) for part in parts]
    return Centrelines(
        points=points,
        radius=np.full(len(points), radius),
        raw_points=points,
        connectivity=np.arange(len(points)),
        offsets=np.concatenate(([0], np.cumsum(counts))),
        vessel_class=np.ones(len(parts)),
        input_id=np.zeros(len(parts)),
        radius_basis=np.zeros(len(points)),
    )


def straight(start: tuple[float, float, float], end: tuple[float, float, float], n: int = 21) -> np.ndarray:
    return np.linspace(start, end, n) * 1e-3


TRUNK = straight((0, 0, 0), (20, 0, 0))
CASES = {
    "T-joint": lines(TRUNK, straight((10.3, 0.05, 0), (10.3, 12, 0))),
    "joined ends": lines(TRUNK, straight((20.04, 0.0, 0), (35, 5, 0))),
    "fused copies": lines(TRUNK, straight((0, 0.03, 0), (20, 0.03, 0), 33)),
}


@pytest.mark.parametrize("kind", sorted(CASES))
def test_declining_leaves_the_lines_as_drawn(kind: str) -> None:
    done = join(CASES[kind])
    (repair,) = [one for one in done.repairs if one.kind == kind]
    other = next(option for option in repair.options if option != repair.choice)
    left = join(CASES[kind], None, Verdicts({repair.id: Verdict(other, "person")}))
    (record,) = [one for one in left.repairs if one.kind == kind]
    assert (record.id, record.choice, record.verdict_by) == (repair.id, other, "person")
    # what was drawn as two lines stays two lines: every drawn point and step is still there
    assert left.graph.n_points == CASES[kind].n_points
    assert left.graph.n_edges == CASES[kind].n_points - 2
    assert done.graph.n_points < left.graph.n_points or done.graph.n_edges != left.graph.n_edges


@pytest.mark.parametrize("kind", sorted(CASES))
def test_confirming_changes_nothing_but_who_decided(kind: str) -> None:
    done = join(CASES[kind])
    (repair,) = [one for one in done.repairs if one.kind == kind]
    again = join(CASES[kind], None, Verdicts({repair.id: Verdict(repair.choice, "person")}))
    assert np.array_equal(again.graph.points, done.graph.points)
    assert np.array_equal(again.graph.edges, done.graph.edges)
    assert [one.verdict_by for one in again.repairs if one.id == repair.id] == ["person"]


def test_an_impossible_choice_is_refused() -> None:
    (repair,) = join(CASES["T-joint"]).repairs
    with pytest.raises(InputError, match="is no choice there"):
        join(CASES["T-joint"], None, Verdicts({repair.id: Verdict("weld", "person")}))


def test_decisions_on_nothing_are_reported() -> None:
    verdicts = Verdicts({"gap-123": Verdict("join", "person"), "gap-456": Verdict("join", "rule")})
    (finding,) = verdicts.unknown(["t-joint-1"])
    assert finding.where == "gap-123"
