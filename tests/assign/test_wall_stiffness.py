"""Where the wave speed of a wall comes from, and what contradicts itself."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from geomprep.assign import WallSettings, assign_walls, imaged_wave_speed
from geomprep.errors import InputError, OpenQuestions
from geomprep.model import Basis

ARTERY, VEIN = 1, 2
MMHG = 133.322387415


def speeds(network, settings, pressure):
    walls, origins, _ = assign_walls(network, settings, np.full(len(network.stations), pressure))
    return imaged_wave_speed(dataclasses.replace(network, walls=walls)), {o.field: o for o in origins}


@pytest.mark.parametrize(
    ("radius", "olufsen", "mynard_smolich", "reymond"),
    # computed outside the package from the published constants, all from MEMORY (the first and last with high, the
    # middle one with medium confidence); E h/r0 to c with ν = 1/2 and ρ = 1060
    [
        (0.1e-3, 32.5350, 13.9153, 21.5547),
        (1.0e-3, 13.6595, 9.89476, 10.8030),
        (2.0e-3, 8.26393, 7.23764, 8.77473),
        (5.0e-3, 7.37690, 4.82608, 6.66579),
        (12.5e-3, 7.37581, 4.60407, 5.06372),
    ],
)
def test_published_relations(straight, radius: float, olufsen: float, mynard_smolich: float, reymond: float) -> None:
    network = straight(((radius, radius), 0.1, ARTERY, "artery"), stations=2)
    for key, expected in [
        ("wall-modulus-olufsen-1999", olufsen),
        ("wall-modulus-mynard-smolich-2015", mynard_smolich),
        ("wave-speed-reymond-2009", reymond),
    ]:
        speed, origins = speeds(network, {"artery": WallSettings(stiffness=key)}, 100 * MMHG)
        assert speed == pytest.approx([expected] * 2, rel=4e-6)  # six printed digits
        assert origins["stations.stiffness"].basis is Basis.PUBLISHED
        assert origins["stations.stiffness"].detail == key


def test_poisson_ratio_enters_a_published_modulus(straight) -> None:
    # c² = (E h/r0)/(2ρ(1 − ν²)): ν = 0 is √(3/4) of ν = 1/2, 8.26393 m/s at 2 mm (check value as above)
    network = straight(((2e-3, 2e-3), 0.1, ARTERY, "artery"), stations=2)
    settings = WallSettings(stiffness="wall-modulus-olufsen-1999", poisson_ratio=0.0)
    speed, _ = speeds(network, {"artery": settings}, 0.0)
    assert speed == pytest.approx([8.26393 * 0.75**0.5] * 2, rel=2e-6)


def test_seen_speed_of_dog_veins_by_its_key(straight) -> None:
    # 1.3 m/s, SEEN in the abstract, doi 10.1001/archsurg.1971.01350010055014
    network = straight(((2e-3, 2e-3), 0.1, VEIN, "vein"), stations=2)
    settings = WallSettings(stiffness="wave-speed-dog-limb-veins-1971", reference_state="imaged")
    speed, _ = speeds(network, {"vein": settings}, 8 * MMHG)
    assert speed == pytest.approx([1.3, 1.3], rel=1e-12)


def test_veins_ask_with_the_bound_as_candidate(straight) -> None:
    # √(10 · 9 · 133.322/1060) = 3.364 m/s
    network = straight(((2e-3, 2e-3), 0.1, VEIN, "vein"), ((2e-3, 2e-3), 0.1, ARTERY, "artery"))
    with pytest.raises(OpenQuestions) as caught:
        speeds(network, {}, 9 * MMHG)
    (question,) = caught.value.questions
    assert question.key == "walls.vein.wave_speed"
    assert question.candidates[0] == "wave_speed above 3.364 m/s"
    assert "dog" in question.candidates[1] and "imaged" in question.candidates[1]
    assert len(question.evidence) == len(question.candidates)


def test_all_questions_are_asked_at_once(straight) -> None:
    network = straight(((2e-3, 2e-3), 0.1, VEIN, "a"), ((2e-3, 2e-3), 0.1, 0, "b"))
    with pytest.raises(OpenQuestions) as caught:
        speeds(network, {"b": WallSettings(reference_state="buckling")}, 0.0)
    assert [question.key for question in caught.value.questions] == ["walls.vein.wave_speed", "walls.b.wave_speed"]


@pytest.mark.parametrize(
    ("code", "settings", "message"),
    [
        (ARTERY, WallSettings(stiffness="user"), "needs wave_speed, or young_modulus and wall_thickness"),
        (ARTERY, WallSettings(young_modulus=4e5), "young_modulus needs wall_thickness"),
        (ARTERY, WallSettings(wave_speed=5.0, young_modulus=4e5), "both stated"),
        (ARTERY, WallSettings(stiffness="wave-speed-reymond-2009", wave_speed=5.0), "both stated"),
        (ARTERY, WallSettings(wave_speed=-5.0), "wave_speed = -5"),
        (ARTERY, WallSettings(young_modulus=0.0, wall_thickness=1e-3), "young_modulus = 0"),
        (ARTERY, WallSettings(young_modulus=4e5, wall_thickness=1e-3, poisson_ratio=0.6), "Poisson ratio 0.6"),
        (ARTERY, WallSettings(stiffness="wave-speed-raymond-2009"), "the nearest are wave-speed-reymond-2009"),
        (ARTERY, WallSettings(stiffness="wall-thickness-blanco-2015"), "gives thickness ratio, no stiffness"),
        (ARTERY, WallSettings(stiffness="blood-density"), "gives density, no stiffness"),
        (ARTERY, WallSettings(stiffness="wave-speed-dog-limb-veins-1971"), "holds for veins"),
        (VEIN, WallSettings(stiffness="wave-speed-reymond-2009"), "holds for arteries"),
        (VEIN, WallSettings(young_modulus=1e6, wall_thickness=5e-4), "does not fix the law of a collapsible vein"),
    ],
)
def test_contradictions_are_refused(straight, code: int, settings: WallSettings, message: str) -> None:
    network = straight(((2e-3, 2e-3), 0.1, code, "vessel"), stations=2)
    with pytest.raises(InputError, match=message) as caught:
        speeds(network, {"artery": settings, "vein": settings}, 0.0)
    assert "\n" not in str(caught.value)
