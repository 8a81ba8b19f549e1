"""Finding the node that a case names."""

import pytest

from geomprep.assign import InletSettings, OutletSettings, find_node, resolve_ends
from geomprep.errors import CaseError
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


def test_one_node_cannot_be_both(fork: Network) -> None:
    with pytest.raises(CaseError):
        resolve_ends(fork, [InletSettings("trunk", pressure=1.0)], [OutletSettings("trunk")])
