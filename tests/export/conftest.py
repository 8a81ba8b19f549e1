"""Networks made by hand: a Y of an artery, and a ring of veins; every number can be followed on paper."""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Callable
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest

from geomprep.export import ExportContext, ImagingState, InputRecord
from geomprep.findings import Finding, Severity
from geomprep.model import (
    Basis,
    Blood,
    Decision,
    Inlet,
    Junctions,
    Lumped,
    Measures,
    Network,
    Nodes,
    Origin,
    Outlet,
    Repair,
    Segments,
    Stations,
    SteadyState,
    Surroundings,
    TubeLaw,
    Walls,
)

VISCOSITY, DENSITY = 0.0035, 1060.0


def cylinders(points: list[Any], pairs: list[tuple[int, int]], radii: list[float], steps: int = 4) -> dict[str, Any]:
    """Straight cylinders between points, with their closed-form measures."""
    at = np.array(points, dtype=float)
    ends = np.array(pairs)
    radius = np.array(radii)
    length = np.linalg.norm(at[ends[:, 1]] - at[ends[:, 0]], axis=1)
    part = np.linspace(0.0, 1.0, steps + 1)
    area = np.pi * radius**2
    stations = Stations(
        offsets=np.arange(len(pairs) + 1) * (steps + 1),
        distance=np.concatenate([part * value for value in length]),
        position=np.concatenate([at[a] + part[:, None] * (at[b] - at[a]) for a, b in pairs]),
        radius=np.repeat(radius, steps + 1),
        basis=np.zeros(len(pairs) * (steps + 1)),
    )
    measures = Measures(
        length=length,
        volume=area * length,
        lateral_area=2 * np.pi * radius * length,
        inverse_area=length / area,
        inverse_fourth_power=length / radius**4,
        radius_at_from=radius,
        radius_at_to=radius,
        radius_for_resistance=radius,
        radius_for_volume=radius,
        minimum_radius=radius,
        median_radius=radius,
        taper=np.zeros(len(pairs)),
        tortuosity=np.ones(len(pairs)),
    )
    return {"position": at, "ends": ends, "area": area, "stations": stations, "measures": measures}


def junctions_of(shape: dict[str, Any], nodes: list[int]) -> Junctions:
    """Ends that meet at nodes, in the order of segments."""
    at, ends, area = shape["position"], shape["ends"], shape["area"]
    rows = [[(s, e) for s in range(len(ends)) for e in (0, 1) if ends[s, e] == node] for node in nodes]
    flat = [item for row in rows for item in row]
    toward = np.array([at[ends[s, 1 - e]] - at[ends[s, e]] for s, e in flat])
    return Junctions(
        node=np.array(nodes),
        offsets=np.cumsum([0] + [len(row) for row in rows]),
        segment=np.array([s for s, _ in flat]),
        end=np.array([e for _, e in flat], dtype=np.uint8),
        direction=toward / np.linalg.norm(toward, axis=1)[:, None],
        area=area[[s for s, _ in flat]],
    )


def assembled(shape: dict[str, Any], roles: list[int], inner: list[int], law: TubeLaw, vessel: int) -> Network:
    """Network with walls at the imaged state; inlets and outlets are set by the caller."""
    count, stations = len(shape["ends"]), shape["stations"]
    transmural = np.full(len(stations), 1200.0)
    resistance = 8 * VISCOSITY / math.pi * shape["measures"].inverse_fourth_power
    return Network(
        nodes=Nodes(
            id=[f"node-{number:012x}" for number in range(len(roles))],
            position=shape["position"],
            height=np.zeros(len(roles)),
            role=np.array(roles),
            source_point=np.arange(len(roles)),
        ),
        segments=Segments(
            id=[f"segment-{number:012x}" for number in range(count)],
            name=["trunk", *[""] * (count - 1)],
            from_node=shape["ends"][:, 0],
            to_node=shape["ends"][:, 1],
            vessel_class=np.full(count, vessel),
            input_id=np.zeros(count),
            strahler_order=np.full(count, -1),
            horsfield_order=np.full(count, -1),
            generation=np.full(count, -1),
        ),
        stations=stations,
        measures=shape["measures"],
        junctions=junctions_of(shape, inner),
        blood=Blood(DENSITY, VISCOSITY, 2.0),
        surroundings=(Surroundings("rest", 0.0),),
        walls=Walls(
            laws=(law,),
            law=np.zeros(count, np.int64),
            reference_state=np.array(["imaged"] * count, dtype=object),
            reference_area=stations.area,
            stiffness=np.full(len(stations), 5e4),
            reference_transmural=transmural,
            imaging_transmural=transmural,
            surroundings=np.zeros(len(stations), np.int64),
        ),
        lumped=Lumped(
            resistance=resistance,
            inertance=DENSITY * shape["measures"].inverse_area,
            compliance=shape["measures"].volume / (5e4 * (law.m - law.n)),  # A dp/dA = K (m - n) where A = A0
        ),
        origins=(
            Origin("blood.density", Basis.USER, "blood.density"),
            Origin("blood.viscosity", Basis.PUBLISHED, "invented-2020"),
            Origin("blood.velocity_profile", Basis.USER, "blood.velocity_profile"),
            Origin("surroundings.pressure", Basis.USER, "surroundings.rest.pressure"),
            Origin("surroundings.reference_height", Basis.USER, "surroundings.rest.reference_height"),
            Origin("tube_laws.m", Basis.PUBLISHED, "invented-2020"),
            Origin("tube_laws.n", Basis.PUBLISHED, "invented-2020"),
            Origin("walls.stiffness", Basis.USER, "walls.artery.wave_speed"),
            Origin("walls.reference_transmural", Basis.DERIVED, "stations.imaging_transmural"),
            Origin("walls.imaging_transmural", Basis.USER, "imaging_state.arterial_pressure"),
            Origin("inlets.mean_flow", Basis.USER, "inlets[0].mean_flow"),
            Origin("outlets.far_pressure", Basis.USER, "outlets[0].pressure"),
            Origin("outlets.peripheral_resistance", Basis.USER, "outlets[0].resistance"),
        ),
    )


def context_for(**changes: Any) -> ExportContext:
    """Context of an invented phantom."""
    given: dict[str, Any] = {
        "name": "saltmere-y",
        "subject": "phantom 0",
        "question": "How is the flow shared?",
        "version": "0.1.0",
        "inputs": (InputRecord("y.vtp", "ab" * 32, "mm", "radius", "inscribed radius", "LPS", 15, 3),),
        "imaging_state": ImagingState("supine", "arterial pressure of the case", arterial_pressure=1200.0),
        "posture": "supine",
        "frame": "LPS",
        "case_sha256": "cd" * 32,
        "findings": (
            Finding("thin vessel", Severity.WARNING, "radius 1 mm is 1.7 voxels", "segment-000000000001",
                    (0.0, 0.0, 0.0), 1.7, 3.0, "1", "invented-2020"),
        ),
        "repairs": (
            Repair("repair-000000000001", "joined ends", "two ends 0.01 mm apart", (0.01, 0.0, 0.0), "join",
                   ("join", "leave open"), conductance_before=0.0, conductance_after=2e-10, raw_points=(3, 4)),
        ),
        "decisions": (Decision("repair-000000000001", "join", "seen on the image", "R. Tester, engineer"),),
        "sources": (
            {"key": "invented-2020", "citation": "A. Nobody: Invented numbers, 2020", "doi": "", "place": "table 1",
             "checked": "memory"},
        ),
        "steps": ("read y.vtp: 15 points on 3 lines", "joined: 15 points to 13"),
    }  # fmt: skip
    return ExportContext(**{**given, **changes})


def y_network() -> SimpleNamespace:
    """A trunk that splits in two: equal pressures behind the outlets, so flows follow from resistances on paper."""
    points = [(0, 0, 0), (0.02, 0, 0), (0.03, 0.01, 0), (0.03, -0.01, 0)]
    shape = cylinders(points, [(0, 1), (1, 2), (1, 3)], [2e-3, 1.5e-3, 1.2e-3])
    law = TubeLaw("artery", "power pair", "p_tm = p0 + K ((A/A0)^m - (A/A0)^n)", 0.5, 0.0)
    network = assembled(shape, [3, 1, 4, 4], [1], law, vessel=1)
    flow, far, bed = 5e-6, 1000.0, 1e9
    resistance = network.lumped.resistance
    branch = resistance[1:] + bed
    share = (1 / branch) / np.sum(1 / branch)
    split = far + flow / np.sum(1 / branch)
    pressure = [split + resistance[0] * flow, split, *(far + bed * flow * share)]
    state = SteadyState(
        pressure=np.array(pressure),
        flow=np.array([flow, *(flow * share)]),
        inlet_flow=np.array([flow]),
        outlet_flow=flow * share,
        mass_residual=0.0,
    )
    network = dataclasses.replace(
        network,
        inlets=(Inlet(0, mean_flow=flow),),
        outlets=tuple(Outlet(node, "resistance", far, peripheral_resistance=bed) for node in (2, 3)),
    )
    return SimpleNamespace(network=network, state=state, context=context_for())


def ring_network() -> SimpleNamespace:
    """Inflow at one side of a square, outlet at the other: two ways of equal resistance share the flow evenly."""
    points = [(0, 0, 0), (0.01, 0, 0), (0.02, 0.01, 0), (0.02, -0.01, 0), (0.03, 0, 0), (0.04, 0, 0)]
    pairs = [(0, 1), (1, 2), (1, 3), (2, 4), (3, 4), (4, 5)]
    shape = cylinders(points, pairs, [3e-3, 2e-3, 2e-3, 2e-3, 2e-3, 3e-3])
    law = TubeLaw("vein", "power pair", "p_tm = p0 + K ((A/A0)^m - (A/A0)^n)", 10.0, -1.5)
    network = assembled(shape, [3, 1, 0, 0, 1, 4], [1, 2, 3, 4], law, vessel=2)
    flow, far = 8e-6, 666.0
    resistance = network.lumped.resistance
    out = far + resistance[5] * flow
    middle = out + resistance[3] * flow / 2
    start = middle + resistance[1] * flow / 2
    half = flow / 2
    state = SteadyState(
        pressure=np.array([start + resistance[0] * flow, start, middle, middle, out, far]),
        flow=np.array([flow, half, half, half, half, flow]),
        inlet_flow=np.array([flow]),
        outlet_flow=np.array([flow]),
        mass_residual=0.0,
    )
    network = dataclasses.replace(
        network, inlets=(Inlet(0, mean_flow=flow),), outlets=(Outlet(5, "fixed pressure", far),)
    )
    return SimpleNamespace(network=network, state=state, context=context_for(name="saltmere-ring"))


@pytest.fixture
def y() -> SimpleNamespace:
    """Network, state and context of the Y."""
    return y_network()


@pytest.fixture
def ring() -> SimpleNamespace:
    """Network, state and context of the ring."""
    return ring_network()


@pytest.fixture
def make() -> Callable[..., SimpleNamespace]:
    """Builders of both, for tests that need several."""
    return lambda name: {"y": y_network, "ring": ring_network}[name]()
