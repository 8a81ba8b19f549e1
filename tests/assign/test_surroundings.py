"""Which surroundings a vessel lies in, and the pressure there by hand."""

import dataclasses

import numpy as np
import pytest

from geomprep.assign import StationSurroundings, SurroundingsSettings, gravity, station_surroundings
from geomprep.errors import CaseError
from geomprep.literature import row
from geomprep.model import Basis, Network

STILL = gravity(None, None)


def where(network: Network, found: StationSurroundings) -> dict[str, str]:
    """Surroundings of each vessel by name."""
    first = network.stations.offsets[:-1]
    return {
        str(name): found.surroundings[number].id
        for name, number in zip(network.segments.name, found.index[first].tolist(), strict=True)
    }


def test_a_name_goes_before_a_class_and_a_class_before_all(fork: Network) -> None:
    settings = {
        "outside": SurroundingsSettings(0.0, vessels=("all",)),
        "sleeve": SurroundingsSettings(500.0, vessels=("arteries",)),
        "cuff": SurroundingsSettings(2000.0, vessels=("Left  Branch",)),
    }
    found = station_surroundings(fork, settings, STILL)
    assert where(fork, found) == {"trunk": "sleeve", "left branch": "cuff", "right branch": "sleeve"}
    assert [one.id for one in found.surroundings] == ["sleeve", "cuff"]
    assert sorted(set(found.external_pressure.tolist())) == [500.0, 2000.0]
    assert [finding.where for finding in found.findings] == ["outside"]


def test_the_order_of_the_case_does_not_decide(fork: Network) -> None:
    cuff = SurroundingsSettings(2000.0, vessels=("left branch",))
    rest = SurroundingsSettings(500.0)
    first = station_surroundings(fork, {"cuff": cuff, "rest": rest}, STILL)
    second = station_surroundings(fork, {"rest": rest, "cuff": cuff}, STILL)
    np.testing.assert_array_equal(first.external_pressure, second.external_pressure)


@pytest.mark.parametrize("word", ["left branch", "arteries", "all"])
def test_two_claims_of_equal_right_are_refused(fork: Network, word: str) -> None:
    settings = {"one": SurroundingsSettings(1.0, vessels=(word,)), "two": SurroundingsSettings(2.0, vessels=(word,))}
    with pytest.raises(CaseError, match=r"surroundings\.two.*surroundings\.one claims it"):
        station_surroundings(fork, settings, STILL)


def test_nothing_stated_is_the_atmosphere_and_leads_to_a_source(fork: Network) -> None:
    found = station_surroundings(fork, {}, STILL)
    assert where(fork, found) == dict.fromkeys(["trunk", "left branch", "right branch"], "atmosphere")
    assert not found.external_pressure.any()
    origin = next(origin for origin in found.origins if origin.field == "surroundings.pressure")
    assert origin.basis is Basis.PUBLISHED
    assert row(origin.detail).checked == "common practice"
    assert found.findings == ()


def test_vessels_left_over_lie_in_the_atmosphere_and_that_is_said(fork: Network) -> None:
    settings = {"atmosphere": SurroundingsSettings(300.0, vessels=("trunk",))}
    found = station_surroundings(fork, settings, STILL)
    assert where(fork, found) == {"trunk": "atmosphere", "left branch": "open air", "right branch": "open air"}
    assert "2 of 3 segments" in found.findings[0].message
    details = {(origin.basis, origin.detail) for origin in found.origins if origin.field == "surroundings.pressure"}
    assert (Basis.USER, "surroundings.atmosphere.pressure") in details
    assert len(details) == 2


def test_a_fluid_column_counts_from_its_reference_height(fork: Network) -> None:
    """Upright, 0.3 m above a reference of 0.1 m: 1000 Pa − 1000 · 9.80665 · 0.2 = −961.33 Pa."""
    lifted = dataclasses.replace(
        fork, stations=dataclasses.replace(fork.stations, position=fork.stations.position * [1, 1, 0] + [0, 0, 0.3])
    )
    settings = {"fluid": SurroundingsSettings(1000.0, 0.1, 1000.0), "empty": SurroundingsSettings(0.0, 0.0, None, ())}
    found = station_surroundings(lifted, settings, gravity("LPS", "upright"))
    np.testing.assert_allclose(found.external_pressure, -961.33, rtol=1e-9)
    fields = {origin.field: origin.detail for origin in found.origins}
    assert fields["surroundings.reference_height"] == "surroundings.fluid.reference_height"
    assert fields["surroundings.fluid_density"] == "surroundings.fluid.fluid_density"
