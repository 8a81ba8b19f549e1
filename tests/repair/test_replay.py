"""Verdicts on record win over every rule, and a declined repair changes only what depends on it."""

from __future__ import annotations

from dataclasses import fields, replace

import pytest
from phantoms.cases import cases

from geomprep.repair import STEPS, Given, RadiusSettings, Verdict, Verdicts, join, mend_graph, mend_radii

ARRAYS = ("points", "radius", "radius_basis", "edges", "edge_basis", "own_radius", "merged_into", "source_point")


def graph_of(case):
    return join(mend_radii(case.centrelines, RadiusSettings(), Verdicts()).centrelines).graph


def moved(factor: float) -> dict[str, object]:
    """Settings of every step with all its numbers moved, those with a limit held within it."""
    found = {}
    for row in STEPS:
        settings = row.settings()
        changed = {
            field.name: getattr(settings, field.name) * factor
            for field in fields(settings)
            if isinstance(getattr(settings, field.name), float)
        }
        for name, value in changed.items():
            if name.endswith(("above", "share_below", "within")) and row.name != "cliques":
                changed[name] = min(value, 1.0)
        if row.name == "kissing":
            changed["radius_ratio"] = max(changed["radius_ratio"], 1.0)
        if row.name == "copies":
            changed["radius_ratio"] = max(changed["radius_ratio"], 1.0)
        found[row.name] = replace(settings, **changed)
    return found


@pytest.mark.parametrize("factor", [0.8, 1.2])
@pytest.mark.parametrize("kind", ["gaps", "spurs", "cliques", "holes", "kissing", "stray", "wide copies", "all"])
def test_replay_with_moved_thresholds_gives_equal_bytes(kind: str, factor: float) -> None:
    for case in cases(kind, 0, 4):
        graph = graph_of(case)
        first = mend_graph(graph, {}, Given())
        record = Verdicts({one.id: Verdict(one.choice, one.verdict_by) for one in first.repairs}, complete=True)
        again = mend_graph(graph, moved(factor), Given(record))
        for name in ARRAYS:
            assert getattr(again.graph, name).tobytes() == getattr(first.graph, name).tobytes(), (case.seed, name)
        assert [(one.id, one.choice, one.verdict_by) for one in again.repairs] == [
            (one.id, one.choice, one.verdict_by) for one in first.repairs
        ]


def test_thresholds_alone_do_change_what_is_done() -> None:
    """The test above would pass for nothing if the moved settings gave the same repairs by themselves."""
    changed = 0
    for case in cases("all", 0, 4):
        graph = graph_of(case)
        one, other = (mend_graph(graph, settings, Given()) for settings in ({}, moved(0.5)))
        changed += {repair.id for repair in one.repairs} != {repair.id for repair in other.repairs}
    assert changed > 0


@pytest.mark.parametrize("kind", ["gaps", "spurs", "holes", "kissing", "stray"])
def test_declining_one_repair_leaves_the_others_as_they_were(kind: str) -> None:
    for case in cases(kind, 0, 3):
        graph = graph_of(case)
        first = mend_graph(graph, {}, Given())
        for declined in first.repairs:
            second = mend_graph(graph, {}, Given(Verdicts({declined.id: Verdict("leave", "person")})))
            verdicts = {one.id: (one.choice, one.verdict_by) for one in second.repairs}
            assert verdicts.pop(declined.id) == ("leave", "person")
            expected = {one.id: (one.choice, one.verdict_by) for one in first.repairs if one.id != declined.id}
            assert {key: verdicts.get(key) for key in expected} == expected, (kind, case.seed, declined.id)
