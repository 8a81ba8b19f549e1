"""Gates on reading: what is stated is applied and checked, what is not stated is asked, nothing is scaled silently."""

import numpy as np
import pytest

from geomprep.errors import CaseError, FileError, InputError, OpenQuestions
from geomprep.files.contents import FileContents
from geomprep.files.frames import direction, gravity_direction, is_right_handed
from geomprep.files.meaning import gate, to_centrelines
from geomprep.files.statement import InputStatement
from geomprep.findings import Severity
from geomprep.model import Basis

# a fork of three lines in millimetres; points 0..6, the fork at point 2; point 7 lies on no line
POINTS = np.array(
    [[0, 0, 0], [0, 0, 40], [0, 0, 80], [20, 0, 110], [40, 0, 140], [-20, 0, 110], [-40, 0, 140], [9, 9, 9]],
    dtype=np.float32,
)
CONNECTIVITY = np.array([0, 1, 2, 2, 3, 4, 2, 5, 6])
OFFSETS = np.array([0, 3, 6, 9])
RADIUS = np.array([3.0, 3.0, 3.0, 2.0, 2.0, 2.5, 2.5, 0.0])
STATED = InputStatement(
    "fork.vtp", vessels="arteries", length_unit="mm", size_array="radius", size_means="inscribed radius", frame="LPS"
)


def fork(point_arrays=None, cell_arrays=None, scale=1.0):
    return FileContents(
        name="fork.vtp",
        sha256="0" * 64,
        format="made here",
        points=POINTS * np.float32(scale),
        connectivity=CONNECTIVITY,
        offsets=OFFSETS,
        point_arrays={"radius": RADIUS * scale} if point_arrays is None else point_arrays,
        cell_arrays=cell_arrays or {},
    )


def stated(**changes):
    return InputStatement(**{**vars(STATED), **changes})


def keys(questions):
    return [question.key for question in questions]


def test_everything_stated_is_one_multiplication_into_metres():
    contents = fork()
    lines, findings = to_centrelines(contents, STATED)
    np.testing.assert_allclose(lines.points[4], [0.040, 0.0, 0.140], rtol=1e-15)
    np.testing.assert_allclose(lines.radius, RADIUS * 1e-3, rtol=1e-15)
    assert lines.raw_points.tobytes() == POINTS.tobytes()
    assert lines.raw_points.dtype == np.float32
    assert lines.line_radius is None
    assert lines.vessel_class.tolist() == [1, 1, 1]
    assert set(lines.radius_basis.tolist()) == {Basis.MEASURED}
    assert lines.extra.keys() == {"radius"}
    assert findings == ()


@pytest.mark.parametrize(
    ("means", "size"),
    [
        ("inscribed radius", RADIUS),
        ("equal-area radius", RADIUS),
        ("diameter", 2.0 * RADIUS),
        ("area", 3.141592653589793 * RADIUS**2),
    ],
)
def test_every_size_meaning_gives_the_same_radius(means, size):
    lines, _ = to_centrelines(fork({"size": size}), stated(size_array="size", size_means=means))
    np.testing.assert_allclose(lines.radius, RADIUS * 1e-3, rtol=1e-14)


def test_a_negative_area_stays_visible_as_a_negative_radius():
    area = np.array([28.0, 28.0, -12.566370614359172, 28, 28, 28, 28, np.nan])  # −4π
    lines, _ = to_centrelines(fork({"a": area}), stated(size_array="a", size_means="area"))
    assert lines.radius[2] == pytest.approx(-2e-3)
    assert np.isnan(lines.radius[7])


def test_sizes_on_lines_are_kept_and_points_take_the_mean_of_their_lines():
    """At the fork the mean of 3, 2 and 2.5 mm is 2.5 mm; a point on no line has none."""
    lines, _ = to_centrelines(fork({}, {"radius": np.array([3.0, 2.0, 2.5])}), STATED)
    np.testing.assert_allclose(lines.line_radius, [3e-3, 2e-3, 2.5e-3], rtol=1e-15)
    np.testing.assert_allclose(lines.radius[:7], [3e-3, 3e-3, 2.5e-3, 2e-3, 2e-3, 2.5e-3, 2.5e-3], rtol=1e-14)
    assert np.isnan(lines.radius[7])


def test_nothing_stated_asks_everything_even_where_one_reading_fits_best():
    with pytest.raises(OpenQuestions) as caught:
        to_centrelines(fork(), InputStatement("fork.vtp"), posture="supine", key="input[2]")
    asked = {question.key: question for question in caught.value.questions}
    assert list(asked) == ["input[2].vessels", "input[2].length_unit", "input[2].size_means", "input[2].frame"]
    assert asked["input[2].length_unit"].candidates[0] == "mm"
    assert asked["input[2].size_means"].candidates[0] == "inscribed radius"
    for question in asked.values():
        assert len(question.candidates) == len(question.evidence) > 1
        assert len(set(question.candidates)) == len(question.candidates)


def test_the_frame_is_asked_only_where_a_posture_needs_it():
    checked = gate(fork(), stated(frame=None))
    assert checked.questions == ()
    assert [(each.kind, each.severity) for each in checked.findings] == [("frame", Severity.NOTE)]
    assert keys(gate(fork(), stated(frame=None), posture="upright").questions) == ["input[0].frame"]


def test_a_mirrored_frame_is_said():
    (finding,) = gate(fork(), stated(frame="LAS")).findings
    assert "left-handed" in finding.message
    assert finding.severity is Severity.WARNING


@pytest.mark.parametrize(
    ("frame", "right_handed"),
    [
        ("LPS", True),
        ("RAS", True),
        ("LAS", False),
        ("RPS", False),
        ("LAI", True),
        ("RSA", False),
        ("RSP", True),
        ("SPL", False),
    ],
)
def test_handedness(frame, right_handed):
    """LPS and RAS are right-handed by their common definitions; one flip or one exchange mirrors."""
    assert is_right_handed(frame) is right_handed


def test_gravity_points_to_the_side_that_lies_down():
    np.testing.assert_array_equal(gravity_direction("RAS", "supine"), [0, -1, 0])
    np.testing.assert_array_equal(gravity_direction("RAS", "prone"), [0, 1, 0])
    np.testing.assert_array_equal(gravity_direction("RAS", "upright"), [0, 0, -1])
    np.testing.assert_array_equal(gravity_direction("RAS", "left side"), [-1, 0, 0])
    np.testing.assert_array_equal(gravity_direction("SAL", "right side"), [0, 0, -1])
    np.testing.assert_array_equal(direction("ILP", "S"), [-1, 0, 0])
    with pytest.raises(InputError, match="posture 'flying'"):
        gravity_direction("LPS", "flying")
    with pytest.raises(InputError, match="frame = 'XYZ'"):
        is_right_handed("XYZ")


def test_several_size_arrays_are_listed_with_their_ranges():
    """A negated array comes first, as a real file has it; it is listed last."""
    arrays = {"VesselRadius": RADIUS[:3], "negative_radius": -RADIUS[:3]}
    contents = fork({"node_Diameter": 2 * RADIUS + 0.1}, dict(reversed(arrays.items())))
    checked = gate(contents, stated(size_array=None))
    (question,) = checked.questions
    assert question.key == "input[0].size_array"
    assert question.candidates == ("node_Diameter", "VesselRadius", "negative_radius")
    assert "on points, 0.1 to 6.1" in question.evidence[0]
    assert "no value above zero" in question.evidence[2]
    assert checked.size is None


def test_one_name_on_points_and_on_lines_is_asked_and_can_be_told_apart():
    contents = fork({"radius": RADIUS}, {"radius": np.array([3.0, 2.0, 2.5])})
    (question,) = gate(contents, stated()).questions
    assert set(question.candidates) == {"radius on points", "radius on lines"}
    lines, _ = to_centrelines(contents, stated(size_array="radius on lines"))
    assert lines.line_radius is not None


def test_vectors_and_other_names_are_no_sizes():
    contents = fork({"radius_vector": np.ones((8, 3)), "flow": np.ones(8), "Radius": RADIUS})
    assert [array.name for array in gate(contents, stated(size_array=None)).candidates] == ["Radius"]


def test_a_column_of_one_component_is_a_size():
    lines, _ = to_centrelines(fork({"radius": RADIUS[:, None]}), STATED)
    np.testing.assert_allclose(lines.radius, RADIUS * 1e-3)


@pytest.mark.parametrize(
    ("point_arrays", "name", "words"),
    [
        ({"radius": RADIUS}, "radios", ("radios", "did you mean 'radius'?")),
        ({"width": RADIUS}, "q", ("no such array", "width")),
        ({}, "q", ("no such array", "no arrays")),
        ({"n": np.ones((8, 3))}, "n", ("one component",)),
        ({"radius": RADIUS, "minus": -RADIUS}, "minus", ("no value above zero", "negative of 'radius'")),
        ({"radius": RADIUS, "z": np.full(8, np.nan)}, "z", ("no value above zero", "name another")),
    ],
)
def test_a_stated_array_that_cannot_serve(point_arrays, name, words):
    with pytest.raises(CaseError) as caught:
        gate(fork(point_arrays), stated(size_array=name), key="input[1]")
    message = str(caught.value)
    assert message.startswith(f"input[1].size_array = '{name}': ")
    assert "\n" not in message
    for word in words:
        assert word in message


def test_no_size_array_and_no_lines_are_one_line_each():
    with pytest.raises(FileError, match=r"^fork\.vtp: no vessel sizes.*arrays: flow") as caught:
        gate(fork({"flow": RADIUS}), stated(size_array=None))
    assert "\n" not in str(caught.value)
    bare = FileContents("v.vtk", "0" * 64, "", POINTS, np.array([], dtype=int), np.array([0]))
    with pytest.raises(FileError, match="8 points and no lines"):
        gate(bare, stated(file="v.vtk"))


@pytest.mark.parametrize(("unit", "severity"), [("um", Severity.WARNING), ("cm", Severity.WARNING), ("m", "error")])
def test_a_unit_that_contradicts_the_numbers_is_a_finding_and_is_applied_as_stated(unit, severity):
    """Radii of 3 um, 3 cm and 3 m: the last is no vessel at all. 3 um lies just above a capillary's."""
    lines, findings = to_centrelines(fork(), stated(length_unit=unit))
    (finding,) = [each for each in findings if each.kind == "scale"]
    assert finding.severity == severity
    assert lines.radius[0] == pytest.approx(3.0 * {"um": 1e-6, "cm": 1e-2, "m": 1.0}[unit])


def test_a_meaning_that_contradicts_the_name_is_a_finding():
    findings = gate(fork({"Diameter": 2 * RADIUS}), stated(size_array="Diameter")).findings
    assert "size meaning" in [each.kind for each in findings]


def test_a_stored_length_that_contradicts_the_lines_is_a_finding():
    """Drawn: 80, 72.11 and 72.11 mm. Another unit for all lines is no contradiction, another ratio is."""
    drawn = np.array([80.0, 2 * np.hypot(20, 30), 2 * np.hypot(20, 30)])
    kinds = lambda length: [each.kind for each in gate(fork(None, {"length": length}), STATED).findings]  # noqa: E731
    assert kinds(drawn * 0.1) == []
    assert kinds(drawn * [1.0, 2.0, 33.5]) == ["stored length"]
    (finding,) = gate(fork(None, {"length": drawn * [1.0, 2.0, 33.5]}), STATED).findings
    assert "1 to 33.5 times" in finding.message


class TestClasses:
    """Arteries and veins in one file."""

    BOTH = stated(vessels="both", class_array="kind", class_values=(1.0, 7.0))

    def test_on_lines(self):
        lines, findings = to_centrelines(fork(None, {"kind": np.array([1, 7, 1])}), self.BOTH)
        assert lines.vessel_class.tolist() == [1, 2, 1]
        assert findings == ()

    def test_on_points_the_ends_of_a_line_may_belong_to_another_vessel(self):
        kind = np.array([1, 1, 1, 7, 7, 1, 1, 1])  # the fork (point 2) is arterial, the vein starts there
        lines, _ = to_centrelines(fork({"radius": RADIUS, "kind": kind}), self.BOTH)
        assert lines.vessel_class.tolist() == [1, 2, 1]

    def test_lines_of_neither_class_are_unknown_and_said(self):
        lines, findings = to_centrelines(fork(None, {"kind": np.array([1, 7, 3])}), self.BOTH)
        assert lines.vessel_class.tolist() == [1, 2, 0]
        assert "1 of 3 lines" in findings[-1].message

    def test_points_that_disagree_inside_a_line_leave_it_unknown(self):
        contents = FileContents(
            "two.vtp", "0" * 64, "", POINTS[:4], np.arange(4), np.array([0, 4]),
            {"radius": RADIUS[:4], "kind": np.array([1, 1, 7, 7])},
        )  # fmt: skip
        lines, _ = to_centrelines(contents, self.BOTH)
        assert lines.vessel_class.tolist() == [0]

    def test_array_and_values_are_asked_with_what_the_file_holds(self):
        contents = fork({"radius": RADIUS, "flow": RADIUS * 0.3}, {"kind": np.array([1, 7, 1])})
        (question,) = gate(contents, stated(vessels="both")).questions
        assert question.key == "input[0].class_array"
        assert question.candidates == ("kind",)
        assert question.evidence == ("1 (2x), 7 (1x)",)
        (question,) = gate(contents, stated(vessels="both", class_array="kind")).questions
        assert question.key == "input[0].class_values"
        assert "{ artery = 1, vein = 7 }" in question.candidates

    def test_an_array_that_tells_no_classes(self):
        contents = fork({"radius": RADIUS, "kind": RADIUS * 0.3})
        with pytest.raises(CaseError, match=r"class_array = 'kind': must hold 2 to 12 different whole numbers"):
            gate(contents, self.BOTH)
        with pytest.raises(CaseError, match="did you mean 'kind'"):
            gate(contents, stated(vessels="both", class_array="kinds"))
