"""The fields table is whole and agrees with the containers it names."""

from __future__ import annotations

import dataclasses
import math
import operator
import re

import pytest

from geomprep import model
from geomprep.errors import InputError
from geomprep.model import BASIS_NAMES, FIXED_BY_FORMAT, Field, field, field_tables
from geomprep.units import UCUM

TYPES = {"number", "integer", "row", "offsets", "id", "text", "choice", "sha256"}
DIMENSIONS = re.compile(r"[nskjtior](\+1)?|[23*+]")
PATH = operator.attrgetter("path")
ROWS = [row for table in field_tables().values() for row in table.fields]


def test_every_field_is_named_once_and_described() -> None:
    paths = [row.path for row in ROWS]
    assert len(paths) == len(set(paths))
    assert [path for row, path in zip(ROWS, paths, strict=True) if not row.description.endswith(".")] == []


@pytest.mark.parametrize("row", ROWS, ids=PATH)
def test_row_is_well_formed(row: Field) -> None:
    assert row.type in TYPES
    assert re.fullmatch(r"[a-z][a-z0-9_]*", row.name)
    assert all(DIMENSIONS.fullmatch(part) for part in row.shape), row.shape
    assert (row.type in {"choice", "row", "offsets"}) == bool(row.choices)
    if row.low is not None and row.high is not None:
        assert row.low <= row.high
    assert all(math.isfinite(bound) for bound in (row.low, row.high) if bound is not None)


@pytest.mark.parametrize("row", [row for row in ROWS if row.type == "number"], ids=PATH)
def test_number_has_a_unit_and_a_basis_of_the_six(row: Field) -> None:
    if row.path not in {"findings.value", "findings.limit"}:  # these carry their unit beside them
        assert row.unit in UCUM.values()
    assert row.basis in {"", FIXED_BY_FORMAT, *BASIS_NAMES}
    assert bool(row.basis_detail) == (row.basis in BASIS_NAMES)


@pytest.mark.parametrize("row", [row for row in ROWS if row.basis == "derived"], ids=PATH)
def test_derived_defaults_name_fields_that_exist(row: Field) -> None:
    for source in row.basis_detail.split(", "):
        assert field(source).path == source


@pytest.mark.parametrize("row", [row for row in ROWS if row.type == "row"], ids=PATH)
def test_row_numbers_refer_to_a_table(row: Field) -> None:
    assert row.choices[0] in field_tables()


def test_attributes_exist_in_the_containers() -> None:
    holders = {
        "nodes": model.Nodes, "segments": model.Segments, "stations": model.Stations, "measures": model.Measures,
        "lumped": model.Lumped, "walls": model.Walls, "junctions": model.Junctions, "cuts": model.Cuts,
        "profiles": model.SegmentProfiles, "resolution": model.SegmentResolution,
        "intervals": model.SegmentIntervals, "bending": model.SegmentBending, "blood": model.Blood,
        "inlets": model.Inlet, "outlets": model.Outlet, "surroundings": model.Surroundings,
    }  # fmt: skip
    known = {f"{name}.{item.name}" for name, kind in holders.items() for item in dataclasses.fields(kind)}
    known |= {"stations.area", "walls.m", "walls.n"}  # a property, and the exponents of each law
    assert {row.attribute for row in ROWS if row.attribute} <= known


def test_bounds_are_read_as_written() -> None:
    radius = field("stations.radius")
    assert (radius.low, radius.above_low, radius.high, radius.shape, radius.in_companion) == (
        0.0,
        True,
        0.1,
        ("k",),
        True,
    )
    order = field("segments.strahler_order")
    assert (order.low, order.above_low, order.needs_basis) == (-1.0, False, True)
    assert field("outlets.node").choices == ("nodes",)
    assert not field("steady_check.tolerance").needs_basis


def test_unknown_field_names_the_nearest() -> None:
    with pytest.raises(InputError, match=r"'stations.radios'.*nearest is 'stations.radius'"):
        field("stations.radios")
