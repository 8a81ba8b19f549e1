"""Reading a case file: what it says in SI, and one line for everything that is wrong with it."""

import dataclasses
import json

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from geomprep.case.file import _RECORDS, read_case
from geomprep.case.keys import key_table
from geomprep.case.sections import StationSpacing
from geomprep.case.values import read_value
from geomprep.errors import CaseError

SMALLEST = """
[[input]]
file = "lines.vtp"
"""


@pytest.fixture
def write(tmp_path):
    """Return a writer of case files beside a file with lines."""
    (tmp_path / "lines.vtp").write_text("<VTKFile/>")

    def written(text):
        path = tmp_path / "case.toml"
        path.write_bytes(text if isinstance(text, bytes) else text.encode())
        return path

    return written


def fault(path):
    with pytest.raises(CaseError) as caught:
        read_case(path)
    message = str(caught.value)
    assert "\n" not in message
    return message


def test_quantities_arrive_in_si(write):
    """1 mmHg = 133.322387415 Pa (NIST SP 811, SEEN in units.py); the rest are decimal shifts."""
    case = read_case(
        write(
            SMALLEST
            + """
voxel = ["0.6 mm", "0.6 mm", "1.2 mm"]
frame = "lps"
[case]
imaged_in = "supine"
[imaging_state]
intracranial_pressure = "10 mmHg"
[segments]
station_spacing = "0.5 radius"
[walls.artery]
stiffness = "user"
wave_speed = "8 m/s"
[blood]
density = "1.06 g/cm^3"
viscosity = "3.5 mPa*s"
velocity_profile = 2
[surroundings.cranium]
pressure = "10 mmHg"
fluid_density = "none"
vessels = "vein"
[[inlets]]
at = "every other open end"
mean_flow = "600 mL/min"
[[outlets]]
at = "10 20 30"
model = "three-element windkessel"
resistance = "1 mmHg*s/mL"
compliance = "1 mL/mmHg"
"""
        )
    )
    assert case.inputs[0].voxel == pytest.approx((0.6e-3, 0.6e-3, 1.2e-3))
    assert case.inputs[0].frame == "LPS"
    assert case.imaging_state.intracranial_pressure == pytest.approx(1333.22387415)
    assert case.imaging_state.venous_pressure is None
    assert case.segments.station_spacing == StationSpacing(of_radius=0.5)
    assert case.walls["artery"].wave_speed == 8.0
    assert case.blood.density == pytest.approx(1060.0)
    assert case.blood.viscosity == pytest.approx(3.5e-3)
    assert case.surroundings["cranium"].fluid_density is None
    assert case.surroundings["cranium"].vessels == ("vein",)
    assert case.inlets[0].mean_flow == pytest.approx(1e-5)
    assert case.outlets[0].resistance == pytest.approx(133.322387415e6)
    assert case.outlets[0].compliance == pytest.approx(1e-6 / 133.322387415)
    assert "blood.viscosity" in case.stated
    assert "walls.artery.wave_speed" in case.stated
    assert "outlets[0].compliance" in case.stated
    assert "surroundings.cranium.reference_height" not in case.stated
    assert case.name == "case"


def test_hash_is_that_of_the_bytes(write):
    """SHA-256 of the text "[[input]]\\nfile = \\"lines.vtp\\"\\n", by the command sha256sum."""
    case = read_case(write('[[input]]\nfile = "lines.vtp"\n'))
    assert case.sha256 == "6b65962656709fd26606fbcdd10f6f9a6ac865c233b141b1be6869ba28340c39"


def test_spacing_as_drawn_and_as_length(write):
    assert read_case(write(SMALLEST + '[segments]\nstation_spacing = "as drawn"')).segments.station_spacing is None
    length = read_case(write(SMALLEST + '[segments]\nstation_spacing = "0.5 mm"')).segments.station_spacing
    assert length == StationSpacing(length=pytest.approx(5e-4))


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("[blood]\nviscositty = '3 mPa*s'", ("blood.viscositty", "did you mean 'viscosity'?")),
        ("[case]\nviscosity = '3 mPa*s'", ("case.viscosity", "belongs in [blood]")),
        ("[wals.artery]\nwave_speed = '8 m/s'", ("wals", "did you mean 'walls'?")),
        ("[repair.gap]\naccept_above = 0.8", ("repair.gap", "did you mean 'gaps'?")),
        ("[repair.gaps]\naccept_above = 1.8", ("repair.gaps.accept_above = 1.8", ">= 0 and <= 1")),
        ("[blood]\nviscosity = 0.0035", ("blood.viscosity = 0.0035", "bare number", "3.5 mPa*s")),
        ("[blood]\nviscosity = '0.0035'", ("blood.viscosity", "needs its unit")),
        ("[blood]\nviscosity = '-3.5 mPa*s'", ("-3.5 mPa*s", "must be > 0")),
        ("[blood]\nviscosity = '3.5 mmHg'", ("mmHg", "no unit of viscosity")),
        ("[blood]\nviscosity = '3.5 stones'", ("stones", "no unit known")),
        ("[blood]\ndensity = true", ("blood.density = true", "must be a density")),
        ("[blood]\nvelocity_profile = inf", ("velocity_profile", "finite")),
        ("[blood]\nvelocity_profile = nan", ("velocity_profile", "finite")),
        ("[blood]\nvelocity_profile = 0", ("velocity_profile = 0", "must be > 0")),
        ("[walls.vein]\npoisson_ratio = 0.51", ("0.51", "<= 0.5")),
        ("[walls.vein]\nstiffness = 'user'", ("walls.vein.stiffness", "give wave_speed")),
        (
            "[walls.vein]\nwave_speed = '4 m/s'\nyoung_modulus = '1 MPa'\nwall_thickness = '1 mm'",
            ("wave_speed and young_modulus",),
        ),
        ("[walls.vein]\nyoung_modulus = '1 MPa'", ("wall_thickness: missing",)),
        ("[walls.vein]\nstiffness = 'some-key'\nwave_speed = '4 m/s'", ("wave_speed is given too",)),
        ("[walls]\nwave_speed = '4 m/s'", ("walls.wave_speed", "[walls.<name>]")),
        ("[case]\nimaged_in = 'suppine'", ("suppine", "did you mean 'supine'?")),
        ("[case]\nname = ''", ("case.name", "must be text")),
        ("[anatomy]\nnames = 'none.csv'", ("none.csv", "no such file", "relative to the folder")),
        ("[segments]\nstation_spacing = '0 radius'", ("0 radius", "must be > 0")),
        ("[segments]\nstation_spacing = 'fine'", ("fine", "as drawn")),
        ("[repair.join]\ntolerance = -0.1", ("tolerance = -0.1", ">= 0")),
        ("[surroundings.cranium]\nfluid_density = 'none'", ("surroundings.cranium.pressure: missing", "10 mmHg")),
        ("[surroundings.cranium]\npressure = '1 mmHg'\nvessels = []", ("vessels = []", "list of names")),
        ("repair = 3", ("repair", "[repair.join]")),
        ("[[inlets]]\nat = 'a'", ("inlets[0]", "neither of mean_flow and pressure")),
        ("[[inlets]]\nat = 'a'\nmean_flow = '1 mL/s'\npressure = '9 mmHg'", ("inlets[0]", "both of")),
        ("[[inlets]]\nmean_flow = '1 mL/s'", ("inlets[0].at: missing",)),
        ("[inlets]\nat = 'a'", ("[[inlets]]", "double brackets")),
        ("[[blood]]\ndensity = '1 g/cm^3'", ("[blood]", "single brackets")),
        ("[[outlets]]\nat = 'a'", ("outlets[0].model: missing", "fixed pressure")),
        ("[[outlets]]\nat = 'a'\nmodel = 'fixed pressure'", ("outlets[0].pressure: missing",)),
        (
            "[[outlets]]\nat = 'a'\nmodel = 'fixed pressure'\npressure = '5 mmHg'\nresistance = '1 mmHg*s/mL'",
            ("outlets[0].resistance", "no key of the model 'fixed pressure'"),
        ),
        ("[[outlets]]\nat = 'a'\nmodel = 'resistance'", ("outlets[0].resistance: missing", "[calibration]")),
        (
            "[[outlets]]\nat = 'a'\nmodel = 'three-element windkessel'\ncompliance = '1 mL/mmHg'\n"
            "resistance = '1 mmHg*s/mL'\ncharacteristic_resistance = '2 mmHg*s/mL'",
            ("characteristic_resistance", "less than the total"),
        ),
        (
            "[[inlets]]\nat = 'a'\npressure = '9 mmHg'\n[[outlets]]\nat = 'a'\nmodel = 'fixed pressure'\n"
            "pressure = '5 mmHg'",
            ("outlets[0].at = 'a'", "inlets[0].at is there already"),
        ),
        ("[calibration]\nsplit = 'radius power'", ("give its exponent",)),
        ("[calibration]\nsplit = 'radius power'\nexponent = 0", ("exponent = 0", "must be > 0")),
        ("[calibration]\nsplit = 'radius power'\nexponent = -2.5", ("exponent = -2.5", "must be > 0")),
        ("[calibration]\ncompliance = '1 mL/mmHg'\ntime_constant = '1 s'", ("keep one of them",)),
        (
            "[calibration]\nmodel = 'resistance'\n[[outlets]]\nat = 'a'\nshare = 0.7\n[[outlets]]\nat = 'b'\nshare = 0.4",
            ("the shares add up to 1.1",),
        ),
        (
            "[calibration]\nmodel = 'resistance'\ntotal_flow = '100 mL/min'\n"
            "[[outlets]]\nat = 'a'\nmean_flow = '150 mL/min'",
            ("150 mL/min", "total_flow 100 mL/min"),
        ),
        ("[[input]]\nfile = 'none.vtp'", ("input[1].file", "none.vtp", "no such file")),
        ("[[input]]\nfile = 'lines.vtp'\nframe = 'LPP'", ("LPP", "one each of L or R")),
        ("[[input]]\nfile = 'lines.vtp'\nframe = 'LP'", ("'LP'", "three letters")),
        ("[[input]]\nfile = 'lines.vtp'\nvoxel = ['1 mm']", ("voxel", "three lengths")),
        ("[[input]]\nfile = 'lines.vtp'\nvoxel = ['1 mm', '1 mm', '-1 mm']", ("voxel[2]", "must be > 0")),
        ("[[input]]\nfile = 'lines.vtp'\nlength_unit = 'MM'", ("'MM'", "did you mean 'mm'?")),
        ("[[input]]\nfile = 'lines.vtp'\nclass_values = { artery = 1, vein = 1 }", ("two different numbers",)),
        ("colour = 3", ("colour", "known here")),
        ("viscosity = '3 mPa*s'", ("viscosity", "a key of [blood]")),
    ],
)
def test_every_fault_names_value_rule_and_way_out(write, text, words):
    top_level_first = "[" not in text.split("=")[0]
    message = fault(write(text + SMALLEST if top_level_first else SMALLEST + text))
    for word in words:
        assert word in message
    assert message.startswith("case.toml: ")
    assert "faults" not in message


def test_all_faults_are_listed_at_once_and_numbered(write):
    message = fault(write(SMALLEST + "lenght_unit = 'mm'\n[blood]\nviscosity = 3\ndensity = '-1 kg/m^3'"))
    assert message.startswith("case.toml: 3 faults: (1) ")
    assert all(word in message for word in ("(2) ", "(3) ", "length_unit", "viscosity = 3", "-1 kg/m^3"))


@pytest.mark.parametrize(
    ("text", "words"),
    [
        (b"[case\nname = 'x'", ("line 1",)),
        (b"[case]\nname = 'x'\nname = 'y'\n", ("line 3", "no valid TOML")),
        (b"[case]\nname = \xff\n", ("line 2", "UTF-8")),
        (b"\x00\x01\x02PNG", ("line 1",)),
        (b"", ("no [[input]] section",)),
        (b"[case]\nname = 'x'\n", ("no [[input]] section",)),
        (b"x = " + b"[" * 100_000, ("no valid TOML",)),
    ],
)
def test_text_that_is_no_case(write, text, words):
    message = fault(write(text))
    assert all(word in message for word in words)


def test_missing_file_and_folder(tmp_path):
    assert "no such file" in fault(tmp_path / "none.toml")
    assert "a folder" in fault(tmp_path)


def test_byte_order_mark_and_windows_line_ends_are_read(write):
    assert read_case(write(b"\xef\xbb\xbf" + SMALLEST.replace("\n", "\r\n").encode())).inputs[0].file == "lines.vtp"


def test_every_key_of_the_table_is_a_field_of_its_record_and_the_other_way_round():
    for section, keys in key_table().items():
        assert set(keys) == {field.name for field in dataclasses.fields(_RECORDS[section])}, section


@pytest.mark.parametrize(
    "key", [key for keys in key_table().values() for key in keys.values()], ids=lambda key: f"{key.section}.{key.key}"
)
def test_examples_of_the_table_can_be_read(key, tmp_path):
    import tomllib

    (tmp_path / key.example).write_text("") if key.kind == "file" else None
    bare = key.kind in ("number", "number or key", "boolean") or key.example[:1] in "[{"
    value = tomllib.loads(f"x = {key.example}" if bare else f'x = "{key.example}"')["x"]
    read_value(value, key, key.key, tmp_path)
    assert key.description.endswith(".")


@settings(
    max_examples=150, derandomize=True, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
@given(data=st.data())
def test_whatever_stands_in_a_case_it_is_read_or_refused_in_one_line(write, data):
    """Values of every TOML kind, odd text among them, at every key."""
    keys = [key for keys in key_table().values() for key in keys.values()]
    odd = st.one_of(
        st.text(max_size=12),
        st.sampled_from(
            [
                "10 mmHg\n",
                "1e999 mm",
                "\x00",
                "a" * 5000,
                "1 kPa^9999",
                "1 mm^-9999",
                "1 m/mm^9999",
                "--3 m",
                "\x1b[31m",
                "１ mm",
                "1/0",
            ]
        ),
    )
    value = st.one_of(odd.map(json.dumps), st.sampled_from(["1" + "0" * 400, "-0.0", "nan", "[]", "{}", "1979-05-27"]))
    key = data.draw(st.sampled_from(keys))
    section = f"[[{key.section[:-2]}]]" if key.section.endswith("[]") else f"[{key.section.replace('*', 'x')}]"
    path = write(SMALLEST + f"{section}\n{key.key} = {data.draw(value)}\n")
    try:
        read_case(path)
    except CaseError as error:
        assert str(error).isprintable()
        assert str(error).startswith("case.toml")
