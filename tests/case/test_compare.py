"""Comparison of network files: resistances that follow from the change, statements that differ, files that do not fit."""

from __future__ import annotations

import json
import math
import shutil
from pathlib import Path

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from geomprep.case.build import build
from geomprep.case.compare import COMPARISON_CAUTIONS, NetworkComparison, VesselChange, compare
from geomprep.case.compare_routes import EndPair
from geomprep.errors import InputError, NetworkFileError
from geomprep.files import write_lines
from geomprep.findings import Severity
from geomprep.measure.comparison_settings import ComparisonSettings

CASE = """
[case]
name = "a Y"
imaged_in = "supine"
[[input]]
file = "arteries.vtp"
vessels = "arteries"
length_unit = "mm"
size_array = "radius"
size_means = "{size_means}"
frame = "{frame}"
[imaging_state]
arterial_pressure = "93 mmHg"
[walls.artery]
stiffness = "user"
wave_speed = "8 m/s"
[segments]
vessels_start_at = "node"
[blood]
viscosity = "{viscosity} mPa*s"
density = "1060 kg/m^3"
[[inlets]]
at = "{inlet}"
mean_flow = "300 mL/min"
"""
OUTLET = """
[[outlets]]
at = "{at}"
model = "fixed pressure"
pressure = "80 mmHg"
"""
VISCOSITY = 4e-3
# start, end, radius in mm
TRUNK, LEFT, RIGHT = ((0, 0, 0), (60, 0, 0), 3.0), ((60, 0, 0), (90, 40, 0), 2.0), ((60, 0, 0), (90, -40, 7), 1.5)
Y = (TRUNK, LEFT, RIGHT)


def poiseuille(vessel: tuple) -> float:
    """8 μ L/(π r⁴) in Pa·s/m³."""
    start, end, radius = vessel
    return 8 * VISCOSITY * math.dist(start, end) * 1e-3 / (math.pi * (radius * 1e-3) ** 4)


def parallel(*resistances: float) -> float:
    return 1 / sum(1 / value for value in resistances)


def network(folder: Path, vessels: tuple, motion=lambda points: points, **stated: str) -> Path:
    """Build a Y and return its folder of results."""
    folder.mkdir()
    steps = 40
    part = np.linspace(0, 1, steps + 1)[:, None]
    lines = [motion(np.array(a) + part * (np.array(b) - np.array(a))) for a, b, _ in vessels]
    write_lines(
        folder / "arteries.vtp",
        np.concatenate(lines),
        np.arange(len(lines) * (steps + 1)),
        np.arange(len(lines) + 1) * (steps + 1),
        {"radius": np.repeat([float(radius) for *_, radius in vessels], steps + 1)},
    )
    ends = [" ".join(map(repr, line[-1].tolist())) for line in lines[1:]]
    given = {"frame": "LPS", "viscosity": "4", "size_means": "equal-area radius", **stated}
    text = CASE.format(inlet=" ".join(map(repr, lines[0][0].tolist())), **given)
    (folder / "case.toml").write_text(text + "".join(OUTLET.format(at=end) for end in ends), encoding="utf-8")
    return build(folder / "case.toml").output_folder


@pytest.fixture(scope="module")
def before(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return network(tmp_path_factory.mktemp("compare") / "before", Y)


@pytest.fixture(scope="module")
def narrowed(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return network(tmp_path_factory.mktemp("compare") / "after", (TRUNK, (*LEFT[:2], 1.4), RIGHT))


def only(found: NetworkComparison) -> VesselChange:
    (vessel,) = found.changed
    return vessel


def test_a_network_with_itself(before: Path) -> None:
    found = compare(before, before / "network.json")
    assert found.changed == ()
    assert len(found.vessels) == 3
    assert (found.fit, found.shared_part) == (None, 1)
    expected = poiseuille(TRUNK) + parallel(poiseuille(LEFT), poiseuille(RIGHT))
    assert found.total == pytest.approx((expected, expected), rel=1e-9)
    assert [finding.kind for finding in found.findings] == ["no noise stated"]
    assert compare(before, before, settings=ComparisonSettings(voxel=4e-4)).findings == ()
    assert found.cautions == COMPARISON_CAUTIONS
    assert "not for diagnosis or treatment" in " ".join(found.cautions)
    assert "not proved absent" in " ".join(found.cautions)


def test_a_narrowed_branch(before: Path, narrowed: Path) -> None:
    """Only the left branch differs, so that its effect is the whole difference of the two networks, on paper."""
    found = compare(before, narrowed)
    vessel = only(found)
    thin = poiseuille((*LEFT[:2], 1.4))
    assert vessel.changes == ("narrower",)
    assert vessel.radius == pytest.approx((2e-3, 1.4e-3), rel=1e-6)
    assert vessel.local_ratio == pytest.approx((0.7, 0.7), rel=1e-6)
    assert vessel.length == pytest.approx((50e-3, 50e-3))
    assert vessel.resistance == pytest.approx((poiseuille(LEFT), thin), rel=1e-9)
    totals = [poiseuille(TRUNK) + parallel(left, poiseuille(RIGHT)) for left in (poiseuille(LEFT), thin)]
    assert found.total == pytest.approx(totals, rel=1e-9)
    assert vessel.effect == pytest.approx(totals[1] - totals[0], rel=1e-6)
    assert vessel.effect_part == pytest.approx(totals[1] / totals[0] - 1, rel=1e-6)
    # from the inlet to one outlet, the other closed: trunk and branch in series
    routes = sorted(route.resistance for route in found.routes)
    left = poiseuille(TRUNK) + poiseuille(LEFT), poiseuille(TRUNK) + thin
    right = (poiseuille(TRUNK) + poiseuille(RIGHT),) * 2
    assert np.array(routes) == pytest.approx(np.array(sorted((left, right))), rel=1e-9)


def test_small_changes_are_summed_up(tmp_path: Path, before: Path) -> None:
    """A trunk narrower by 3 % is within the limit of 5 %, and raises its resistance by 0.97⁻⁴ − 1 = 13 %."""
    found = compare(before, network(tmp_path / "slightly", ((*TRUNK[:2], 0.97 * 3), LEFT, RIGHT)))
    assert found.changed == ()
    (note,) = (one for one in found.findings if one.kind == "below the limits")
    expected = poiseuille(TRUNK) * (0.97**-4 - 1) / found.total[0]
    assert expected > 0.01
    assert note.value == pytest.approx(expected, rel=1e-6)
    assert sorted(vessel.effect == 0 for vessel in found.vessels) == [False, True, True]


def test_two_changes_share_the_difference(tmp_path: Path, before: Path) -> None:
    """Trunk and left branch both narrower.

    The trunk lies in series with the rest: making its change in the first network and taking it back in
    the second both give R_T' − R_T. For the branch both give the difference of the parallel values. They add up.
    """
    changed = ((*TRUNK[:2], 2.4), (*LEFT[:2], 1.4), RIGHT)
    found = compare(before, network(tmp_path / "both", changed))
    effect = {vessel.radius[0]: vessel.effect for vessel in found.changed}
    assert sorted(effect) == pytest.approx([2e-3, 3e-3], rel=1e-6)
    trunk, left = effect[max(effect)], effect[min(effect)]
    assert trunk == pytest.approx(poiseuille(changed[0]) - poiseuille(TRUNK), rel=1e-6)
    assert trunk + left == pytest.approx(found.total[1] - found.total[0], rel=1e-6)
    assert abs(found.changed[0].effect) >= abs(found.changed[1].effect)


def test_a_branch_that_is_gone(tmp_path: Path, before: Path) -> None:
    """Without the right branch the rest is one line: trunk and left branch joined into a segment of both."""
    found = compare(before, network(tmp_path / "without", (TRUNK, LEFT)))
    kinds = {vessel.changes: vessel for vessel in found.changed}
    gone = next(vessel for changes, vessel in kinds.items() if changes == ("gone",))
    series = poiseuille(TRUNK) + poiseuille(LEFT)
    whole = poiseuille(TRUNK) + parallel(poiseuille(LEFT), poiseuille(RIGHT))
    assert gone.effect == pytest.approx(series - whole, rel=1e-9)
    assert gone.length == (pytest.approx(math.dist(*RIGHT[:2]) * 1e-3), None)
    assert gone.radius == (pytest.approx(1.5e-3), None)
    # the joint is one point of √(3·2) mm now, so that the pieces beside it taper: with r linear from a to b
    # ∫ds/r⁴ = h (a² + ab + b²)/(3 a³b³)
    joint = math.sqrt(6)
    taper = [
        poiseuille(vessel) / 40 * (r**4 * (r * r + r * joint + joint**2) / (3 * r**3 * joint**3) - 1)
        for vessel, r in ((TRUNK, 3), (LEFT, 2))
    ]
    assert found.total[1] == pytest.approx(series + sum(taper), rel=1e-9)
    assert set(kinds) == {("gone",), ("joined",)}
    warning = next(finding for finding in found.findings if finding.kind == "ends of one network")
    assert "outlet" in warning.message
    assert "first network only" in warning.message
    assert [end.nodes[1] for end in found.ends if isinstance(end, EndPair)].count(None) == 1


def test_the_only_way_has_no_number(tmp_path: Path) -> None:
    """A tube elsewhere: the first is gone, the second is new, and each is the only way of its network."""
    here, there = (
        network(tmp_path / name, (((0, y, 0), (60, y, 0), 3.0), ((60, y, 0), (90, y, 0), 3.0)))
        for name, y in (("here", 0), ("there", 40))
    )
    found = compare(here, there)
    assert {(vessel.changes, vessel.effect) for vessel in found.changed} == {(("gone",), None), (("new",), None)}
    assert found.findings[0].severity is Severity.ERROR
    assert compare(here, there, fit=True).changed == ()


def test_swapped_files_mirror_the_answer(before: Path, narrowed: Path) -> None:
    forth, back = compare(before, narrowed), compare(narrowed, before)
    one, two = only(forth), only(back)
    assert two.changes == ("wider",)
    assert one.segments == two.segments[::-1]
    for name in ("length", "shared", "radius", "resistance"):
        assert getattr(one, name) == getattr(two, name)[::-1]
    assert one.effect == pytest.approx(-two.effect, rel=1e-12)
    assert forth.total == back.total[::-1]
    assert [route.resistance for route in forth.routes] == [route.resistance[::-1] for route in back.routes]


def test_a_moved_network_needs_the_fit(tmp_path: Path, before: Path) -> None:
    turn, shift = Rotation.from_rotvec([0.2, -0.5, 0.3]), np.array([120.0, -40.0, 25.0])
    changed = (TRUNK, (*LEFT[:2], 1.4), RIGHT)
    moved = network(tmp_path / "moved", changed, lambda points: turn.apply(points) + shift)
    apart = compare(before, moved)
    assert {vessel.changes for vessel in apart.vessels} == {("gone",), ("new",)}
    assert apart.findings[0].severity is Severity.ERROR
    fitted = compare(before, moved, fit=True)
    assert fitted.fit.angle == pytest.approx(turn.magnitude(), abs=1e-3)
    np.testing.assert_allclose(fitted.fit.moved((turn.apply([90, 40, 0]) + shift) * 1e-3), [0.09, 0.04, 0], atol=1e-4)
    vessel = only(fitted)
    assert (vessel.changes, vessel.radius) == (("narrower",), pytest.approx((2e-3, 1.4e-3), rel=1e-6))
    assert fitted.total == pytest.approx(apart.total, rel=1e-12)
    assert all(None not in end.nodes for end in fitted.ends)


def test_blood_of_the_first_holds_for_both(tmp_path: Path, before: Path) -> None:
    thick = network(tmp_path / "thick", Y, viscosity="8", size_means="inscribed radius")
    found = compare(before, thick)
    assert found.changed == ()
    assert found.total[1] == pytest.approx(found.total[0], rel=1e-9)
    said = " ".join(finding.message for finding in found.findings)
    assert "0.004" in said
    assert "0.008" in said
    assert "inscribed radius" in said


def test_frames(tmp_path: Path, before: Path) -> None:
    with pytest.raises(InputError, match=r"frame LPS.* in RAS"):
        compare(before, network(tmp_path / "other", Y, frame="RAS"))


def edited(source: Path, target: Path, change) -> Path:
    """A copy of a network file with something changed."""
    document = json.loads((source / "network.json").read_text(encoding="utf-8"))
    change(document)
    target.write_text(json.dumps(document), encoding="utf-8")
    return target


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda d: d.update(format_version="9.9"), "format_version is '9.9', '1.0' is needed"),
        (lambda d: d.pop("format"), "format is missing"),
        (lambda d: d["units"].update(length="mm"), "not valid .*length"),
        (lambda d: d["segments"]["lumped"]["resistance"].__setitem__(0, 1.0), "not valid .*steady check"),
    ],
)
def test_files_that_do_not_fit_are_refused_in_one_line(tmp_path: Path, before: Path, change, words: str) -> None:
    file = edited(before, tmp_path / "network.json", change)
    with pytest.raises(NetworkFileError, match=words) as refused:
        compare(before, file)
    assert "\n" not in str(refused.value)
    assert str(file) in str(refused.value)


def test_posture_is_said(tmp_path: Path, before: Path) -> None:
    file = edited(before, tmp_path / "network.json", lambda d: d["imaging_state"].update(posture="upright"))
    (warning,) = (one for one in compare(before, file).findings if one.severity is Severity.WARNING)
    assert "supine and upright" in warning.message


def test_a_folder_without_network_and_what_is_no_json(tmp_path: Path, before: Path) -> None:
    with pytest.raises(NetworkFileError, match=r"holds no network.json"):
        compare(tmp_path, before)
    (tmp_path / "a.json").write_text("{", encoding="utf-8")
    with pytest.raises(NetworkFileError, match=r"a.json: json"):
        compare(tmp_path / "a.json", before)


def test_the_folder_of_a_case_will_do(before: Path, tmp_path: Path) -> None:
    shutil.copytree(before.parent, tmp_path / "case")
    assert compare(tmp_path / "case", before).changed == ()


def test_what_is_too_much_is_left_out_and_said(before: Path, narrowed: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("geomprep.case.compare_routes.MOST_EFFECTS", 0)
    monkeypatch.setattr("geomprep.case.compare_routes.MOST_ROUTES", 1)
    found = compare(before, narrowed)
    assert only(found).effect is None
    assert len(found.routes) == 1
    said = [finding.message for finding in found.findings if finding.kind == "left out"]
    assert ["effect of 1 vessels" in said[0], "1 pairs" in said[1]] == [True, True]


def test_stations_in_a_companion(tmp_path: Path, before: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("geomprep.export.neutral.MOST_STATIONS_INSIDE", 10)
    folder = network(tmp_path / "apart", Y)
    assert len(list(folder.glob("stations-*.npz"))) == 1
    found = compare(before, folder)
    assert (found.changed, found.shared_part) == ((), 1)
