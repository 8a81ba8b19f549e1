"""Finding the node that a case names."""

import dataclasses

import numpy as np
import pytest

from geomprep.assign import InletSettings, OutletSettings, find_node, resolve_ends
from geomprep.errors import CaseError, OpenQuestions
from geomprep.model import Network


def test_names_ids_prefixes_and_places_find_the_same_node(fork: Network) -> None:
    by_name = find_node(fork, "left branch")
    assert find_node(fork, "Left Branch") == by_name
    assert find_node(fork, str(fork.nodes.id[by_name])) == by_name
    assert find_node(fork, str(fork.nodes.id[by_name])[:-1]) == by_name
    assert find_node(fork, "160 50 0", metres_per_unit=1e-3) == by_name
    assert find_node(fork, "160.5 49.8 0.2", metres_per_unit=1e-3) == by_name


@pytest.mark.parametrize("at", ["left leg", "999 0 0", "node-", "1 2", ""])
def test_what_fits_nothing_or_several_is_refused(fork: Network, at: str) -> None:
    with pytest.raises(CaseError):
        find_node(fork, at, key="outlets[0].at")


def test_roles_follow(fork: Network) -> None:
    ends = resolve_ends(fork, [InletSettings("trunk", pressure=1.0)], [OutletSettings("every other open end")])
    assert sorted(ends.network.nodes.role.tolist()) == [1, 3, 4, 4]
    assert len(ends.left_open) == 0


def test_an_end_that_nobody_names_is_said(fork: Network) -> None:
    ends = resolve_ends(fork, [InletSettings("trunk", pressure=1.0)], [OutletSettings("left branch")])
    assert len(ends.left_open) == 1
    assert ends.findings


@pytest.mark.parametrize(
    ("inlets", "outlets", "keys"),
    [
        ([], [OutletSettings("left branch")], ["inlets[0].at"]),
        ([InletSettings("trunk")], [], ["outlets[0].at"]),
        ([], [], ["inlets[0].at", "outlets[0].at"]),
    ],
)
def test_no_inlet_or_no_outlet_is_a_question(fork: Network, inlets: list, outlets: list, keys: list[str]) -> None:
    with pytest.raises(OpenQuestions) as caught:
        resolve_ends(fork, inlets, outlets)
    assert [question.key for question in caught.value.questions] == keys
    for question in caught.value.questions:
        assert "'trunk'" in question.candidates[0]  # the widest first
        assert question.evidence == ("radius 3 mm", "radius 2 mm", "radius 1.5 mm")


def test_entries_and_order_of_ends(fork: Network) -> None:
    """Entries keep the order of the case; the wide entry takes what is left."""
    entries = [OutletSettings("right branch"), OutletSettings("every other open end")]
    ends = resolve_ends(fork, [InletSettings("trunk", pressure=1.0)], entries)
    assert ends.inlet_entries.tolist() == [0]
    assert ends.outlet_entries.tolist() == [0, 1]
    assert ends.outlet_nodes.tolist() == [find_node(fork, "right branch"), find_node(fork, "left branch")]
    assert ends.findings == ()


def test_wide_entry_without_anything_left_is_said(fork: Network) -> None:
    entries = [OutletSettings(at) for at in ("right branch", "left branch", "every other open end")]
    ends = resolve_ends(fork, [InletSettings("trunk", pressure=1.0)], entries)
    assert ends.outlet_entries.tolist() == [0, 1]
    assert "no open end is left" in ends.findings[0].message


def test_all_faults_at_once(fork: Network) -> None:
    inlets = [InletSettings("tronk"), InletSettings("every other open end")]
    with pytest.raises(CaseError) as caught:
        resolve_ends(fork, inlets, [OutletSettings("left branch"), OutletSettings("every other open end")])
    said = str(caught.value)
    assert "inlets[0].at = 'tronk'" in said
    assert "nearest names are trunk" in said
    assert "outlets[1].at: 'every other open end' stands twice" in said


def test_ambiguous_names_list_their_ends_and_inner_nodes_go_by_id(fork: Network) -> None:
    both = np.where(fork.segments.name == "trunk", "trunk", "branches").astype(object)
    network = dataclasses.replace(fork, segments=dataclasses.replace(fork.segments, name=both))
    with pytest.raises(CaseError, match=r"2 open ends \(node-.* at \(160, -50, 0\) mm, node-.* at \(160, 50, 0\) mm\)"):
        find_node(network, "branches")
    joint = int(np.intersect1d(fork.segments.from_node, fork.segments.to_node)[0])
    assert find_node(network, str(network.nodes.id[joint])) == joint
    assert find_node(network, "0.1 0 0") == joint
    with pytest.raises(CaseError, match=r"'trunk'.*100 mm away"):
        find_node(network, "-0.1 0 0")


def test_one_node_cannot_be_both(fork: Network) -> None:
    with pytest.raises(CaseError):
        resolve_ends(fork, [InletSettings("trunk", pressure=1.0)], [OutletSettings("trunk")])
