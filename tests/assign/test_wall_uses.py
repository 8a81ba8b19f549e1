"""Which wall setting holds where: classes, vessels of their own, unknown classes."""

from __future__ import annotations

import pytest

from geomprep.assign.wall_uses import WallSettings, wall_uses
from geomprep.errors import InputError

RADIUS, UNKNOWN, ARTERY, VEIN = (2e-3, 2e-3), 0, 1, 2


@pytest.fixture
def segments(straight):
    """An artery, two veins of one name, another vein and a vessel of unknown class."""
    return straight(
        (RADIUS, 0.1, ARTERY, "carotid"),
        (RADIUS, 0.1, VEIN, "jugular"),
        (RADIUS, 0.1, VEIN, "jugular"),
        (RADIUS, 0.1, VEIN, "vertebral vein"),
        (RADIUS, 0.1, UNKNOWN, "mystery"),
    ).segments


def found(segments, settings):
    return {use.key: use for use in wall_uses(segments, settings)}


def test_every_segment_belongs_to_one_use(segments) -> None:
    uses = wall_uses(segments, {"jugular": WallSettings(wave_speed=4.0), "s4": WallSettings(reference_state="imaged")})
    assert sum(use.segments.astype(int) for use in uses).tolist() == [1, 1, 1, 1, 1]
    assert [use.key for use in uses] == ["walls.artery", "walls.vein", "walls.jugular", "walls.s4"]


def test_defaults_of_the_classes(segments) -> None:
    # exponents: 1/2, 0 (Formaggia et al. 2003) and 10, −3/2 (Brook et al. 1999), both from MEMORY (high confidence)
    uses = found(segments, {"mystery": WallSettings(reference_state="buckling")})
    assert uses["walls.artery"].settings.reference_state == "imaged"
    assert uses["walls.vein"].settings.reference_state == "buckling"
    assert dict(uses["walls.artery"].exponents.coefficients) == {"m": 0.5, "n": 0.0}
    assert dict(uses["walls.vein"].exponents.coefficients) == {"m": 10.0, "n": -1.5}


def test_a_vessel_takes_over_what_it_leaves_open(segments) -> None:
    settings = {
        "vein": WallSettings(wave_speed=4.0, reference_state="imaged"),
        "jugular": WallSettings(wave_speed=5.0),
        "vertebral vein": WallSettings(reference_state="buckling"),
        "mystery": WallSettings(reference_state="imaged"),
    }
    uses = wall_uses(segments, settings)
    jugular = next(use for use in uses if use.segments[1])
    assert (jugular.settings.wave_speed, jugular.settings.reference_state) == (5.0, "imaged")
    vertebral = next(use for use in uses if use.segments[3])
    # the stiffness is that of the class, and its origin leads there
    assert (vertebral.settings.wave_speed, vertebral.settings.reference_state) == (4.0, "buckling")
    assert vertebral.key == "walls.vein"


def test_the_law_of_an_unknown_class_follows_what_is_stated(segments) -> None:
    for settings, expected in [
        (WallSettings(stiffness="wave-speed-reymond-2009"), "artery"),
        (WallSettings(stiffness="wave-speed-dog-limb-veins-1971", reference_state="imaged"), "vein"),
        (WallSettings(wave_speed=5.0, reference_state="imaged"), "artery"),
        (WallSettings(wave_speed=5.0, reference_state="buckling"), "vein"),
    ]:
        assert found(segments, {"mystery": settings})["walls.mystery"].vessel_class == expected


@pytest.mark.parametrize(
    ("settings", "message"),
    [
        ({}, r"1 segment\(s\) are neither artery nor vein \(mystery\)"),
        ({"mystery": WallSettings(wave_speed=5.0)}, "the vessel class is unknown.*reference_state"),
        ({"jugglar": WallSettings()}, "no vessel has this name; the nearest are jugular"),
        ({"jugular": WallSettings(), "s1": WallSettings()}, "name the same segment"),
        (
            {"artery": WallSettings(reference_state="relaxed"), "mystery": WallSettings(reference_state="imaged")},
            "choose imaged or buckling",
        ),
    ],
)
def test_contradictions_are_refused(segments, settings: dict[str, WallSettings], message: str) -> None:
    with pytest.raises(InputError, match=message):
        wall_uses(segments, settings)
