"""Heights, surroundings and the pressure at imaging, by hand."""

import dataclasses

import numpy as np
import pytest

from geomprep.assign import (
    ImagingPressures,
    InletSettings,
    OutletSettings,
    SurroundingsSettings,
    assign_inlets,
    gravity,
    heights,
    imaging_transmural,
    resolve_ends,
    station_surroundings,
    with_heights,
)
from geomprep.errors import CaseError, OpenQuestions
from geomprep.model import Network

G = 9.80665


@pytest.mark.parametrize(
    ("frame", "posture", "down"),
    [
        ("LPS", "supine", (0, 1, 0)),  # y grows to the back, on which a supine body lies
        ("RAS", "supine", (0, -1, 0)),
        ("LPS", "prone", (0, -1, 0)),
        ("LPS", "upright", (0, 0, -1)),
        ("LPS", "left side", (1, 0, 0)),
        ("RAS", "left side", (-1, 0, 0)),
        ("RAS", "right side", (1, 0, 0)),
        ("SPL", "upright", (-1, 0, 0)),
    ],
)
def test_direction_of_gravity(frame: str, posture: str, down: tuple[int, int, int]) -> None:
    assert gravity(frame, posture).vector == pytest.approx(tuple(G * one for one in down))


def test_height_is_against_gravity() -> None:
    field = gravity("LPS", "upright")
    assert heights(field, np.array([[0.0, 0, 0.3], [0.1, 0.2, -0.1]])).tolist() == pytest.approx([0.3, -0.1])


@pytest.mark.parametrize(("frame", "posture"), [("LLS", "supine"), ("XYZ", "supine"), ("LPS", "hanging")])
def test_impossible_frames_and_postures_are_refused(frame: str, posture: str) -> None:
    with pytest.raises(CaseError):
        gravity(frame, posture)


def test_without_frame_or_posture_there_is_no_gravity_and_that_is_said() -> None:
    for frame, posture in ((None, "supine"), ("LPS", None)):
        field = gravity(frame, posture)
        assert field.vector == (0, 0, 0)
        assert "7.8 mmHg" in field.findings[0].message  # 10 cm of blood: 1060 · 9.80665 · 0.1/133.322 = 7.80


def test_fluid_column_outside(fork: Network) -> None:
    """10 mmHg at height 0 in water: 1000 · 9.80665 · 0.05 = 490.3 Pa less 5 cm higher up."""
    field = gravity("LPS", "upright")
    turned = dataclasses.replace(
        fork, stations=dataclasses.replace(fork.stations, position=fork.stations.position[:, [0, 2, 1]])
    )
    settings = {"cranium": SurroundingsSettings(1333.22, 0.0, 1000.0, ("left branch",))}
    found = station_surroundings(turned, settings, field)
    inside = np.array([found.surroundings[row].id == "cranium" for row in found.index])
    height = turned.stations.position[:, 2]
    np.testing.assert_allclose(found.external_pressure[inside], 1333.22 - 9806.65 * height[inside], rtol=1e-12)
    assert (found.external_pressure[~inside] == 0).all()
    assert inside.sum() == 11


def test_a_name_that_fits_no_vessel_is_refused(fork: Network) -> None:
    settings = {"cranium": SurroundingsSettings(1333.22, 0.0, None, ("left brunch",))}
    with pytest.raises(CaseError, match="left b"):
        station_surroundings(fork, settings, gravity("LPS", "supine"))


def test_pressure_at_imaging(fork: Network) -> None:
    """Arteries: the stated pressure less the column; veins: a steady solve, checked at the ends by hand."""
    field = gravity("LPS", "supine")
    network = with_heights(fork, field)
    inlets, entries = (
        [InletSettings("trunk", mean_flow=5e-6)],
        [OutletSettings("every other open end", "fixed pressure", 600.0)],
    )
    ends = resolve_ends(network, inlets, entries)
    made, _, _ = assign_inlets(ends, inlets)
    network = dataclasses.replace(ends.network, inlets=made)
    outside = np.full(len(network.stations), 100.0)
    with pytest.raises(OpenQuestions):
        imaging_transmural(network, ends, entries, ImagingPressures(), field, outside)
    arterial = imaging_transmural(network, ends, entries, ImagingPressures(arterial=12000.0), field, outside)
    column = 1060 * G * -network.stations.position[:, 1]
    np.testing.assert_allclose(arterial.transmural, 12000 - column - 100, rtol=1e-12)
    veins = dataclasses.replace(network, segments=dataclasses.replace(network.segments, vessel_class=np.full(3, 2)))
    found = imaging_transmural(veins, ends, entries, ImagingPressures(), field, outside).transmural
    last = network.stations.offsets[1:] - 1
    at_outlets = network.segments.name != "trunk"
    np.testing.assert_allclose(found[last][at_outlets], 600 - 100, rtol=1e-9)
    # both outlets stand at 600 Pa, but the left one lies 5 cm lower and the right one higher in this posture
    assert found[last][~at_outlets] != pytest.approx(500)
