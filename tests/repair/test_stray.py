"""Short parts that hang together with nothing are dropped on record; others are kept."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from geomprep.errors import InputError
from geomprep.repair import Given, Verdict, Verdicts, join
from geomprep.repair.parts import components
from geomprep.repair.stray import StraySettings, drop_stray


def two_parts(lines, length: float):
    """A vessel of 120 mm and a part of another length 30 mm away, radius 2 mm."""
    long = np.linspace(0, 120e-3, 61)[:, None] * [0, 0, 1.0]
    part = np.linspace(0, length, 9)[:, None] * [0, 0, 1.0] + [30e-3, 0, 0]
    return join(lines([long, part], 2e-3)).graph


@pytest.mark.parametrize(("length", "goes"), [(8e-3, True), (10e-3, False)])
def test_parts_below_nine_millimetres_go(lines, length: float, goes: bool) -> None:
    result = drop_stray(two_parts(lines, length), StraySettings(), Given())
    assert components(result.graph.n_points, result.graph.edges)[0] == (1 if goes else 2)


def test_length_and_volume_are_on_record(lines) -> None:
    (repair,) = drop_stray(two_parts(lines, 8e-3), StraySettings(), Given()).repairs
    # π 2² 8 = 100.5 mm³
    assert (
        "a part of 8 mm and 101 mm³ hangs together with nothing else; the longest of its class has 120 mm"
        in repair.reason
    )
    assert repair.raw_points == tuple(range(61, 70))


def test_a_share_of_the_longest_protects_small_networks(lines) -> None:
    assert drop_stray(two_parts(lines, 8e-3), StraySettings(share_below=0.05), Given()).repairs == ()


def test_named_parts_and_declined_ones_stay(lines) -> None:
    graph = two_parts(lines, 8e-3)
    protected = np.zeros(graph.n_points, np.bool_)
    protected[-3] = True
    assert drop_stray(replace(graph, protected=protected), StraySettings(), Given()).repairs == ()
    (repair,) = drop_stray(graph, StraySettings(), Given()).repairs
    kept = drop_stray(graph, StraySettings(), Given(Verdicts({repair.id: Verdict("leave", "person")})))
    assert kept.graph.n_edges == graph.n_edges


@pytest.mark.parametrize("settings", [{"shorter_than": -1.0}, {"share_below": 1.0}])
def test_limits_out_of_range(settings: dict) -> None:
    with pytest.raises(InputError, match=r"repair\.stray\."):
        StraySettings(**settings)
