"""What is said about walls: once per row or setting, with numbers."""

from __future__ import annotations

import numpy as np
import pytest

from geomprep.assign import WallSettings, assign_walls
from geomprep.findings import Severity

ARTERY, VEIN = 1, 2
MMHG = 133.322387415


def findings(network, settings, transmural):
    pressure = np.broadcast_to(transmural, len(network.stations))
    return {finding.kind: finding for finding in assign_walls(network, settings, pressure)[2]}


def test_nothing_to_say(straight) -> None:
    artery = straight(((2e-3, 1e-3), 0.1, ARTERY, "a"))
    assert findings(artery, {"artery": WallSettings(wave_speed=5.0)}, 90 * MMHG) == {}
    stated = WallSettings(stiffness="wave-speed-reymond-2009")
    assert findings(artery, {"artery": stated}, 100 * MMHG) == {}
    assert findings(straight(((2e-3, 1e-3), 0.1, VEIN, "v")), {"vein": WallSettings(wave_speed=6.0)}, 5 * MMHG) == {}


def test_a_default_is_said(straight) -> None:
    found = findings(straight(((2e-3, 1e-3), 0.1, ARTERY, "a")), {}, 100 * MMHG)
    assert set(found) == {"stiffness by default"}
    # 13.3/4^0.3 = 8.77 and 13.3/2^0.3 = 10.8
    assert "8.77 to 10.8 m/s" in found["stiffness by default"].message


def test_radii_outside_a_relation_are_one_finding(straight) -> None:
    # radii 0.8 → 0.3 mm in 11 steps of 0.05: below 0.5 mm are 0.45, 0.40, 0.35, 0.30 in each vessel
    network = straight(((0.8e-3, 0.3e-3), 0.1, ARTERY, "a"), ((0.8e-3, 0.3e-3), 0.1, ARTERY, "b"))
    found = findings(network, {"artery": WallSettings(stiffness="wave-speed-reymond-2009")}, 100 * MMHG)
    assert set(found) == {"outside the range of a published relation"}
    (finding,) = found.values()
    assert "8 of 22 stations" in finding.message
    assert (finding.value, finding.limit, finding.unit) == (pytest.approx(0.3e-3), pytest.approx(0.5e-3), "m")
    assert finding.source == "wave-speed-reymond-2009"


@pytest.mark.parametrize(("pressure", "severity"), [(90, Severity.NOTE), (70, Severity.WARNING)])
def test_a_row_that_holds_at_another_pressure(straight, pressure: float, severity: Severity) -> None:
    network = straight(((2e-3, 1e-3), 0.1, ARTERY, "a"))
    found = findings(network, {"artery": WallSettings(stiffness="wave-speed-reymond-2009")}, pressure * MMHG)
    finding = found["stiffness at another pressure"]
    assert finding.severity is severity
    assert "100 mmHg" in finding.message and f"{pressure} mmHg" in finding.message


def test_dog_veins_carry_their_caution(straight) -> None:
    network = straight(((2e-3, 1e-3), 0.1, VEIN, "v"))
    settings = WallSettings(stiffness="wave-speed-dog-limb-veins-1971", reference_state="imaged")
    found = findings(network, {"vein": settings}, 5 * MMHG)
    assert set(found) == {"published value with a caution", "collapse point not modelled"}
    assert "dogs" in found["published value with a caution"].message
    assert all(finding.severity is Severity.WARNING for finding in found.values())
    assert set(findings(network, {"vein": settings}, 0.0)) == {"published value with a caution"}


def test_an_imaged_state_far_from_the_buckling_point(straight) -> None:
    # K (x^10 − x^(−3/2)) = p and ρc² = K (10 x^10 + 1.5 x^(−3/2)): x = 1.2 needs ρc² = 11.61 p by hand, so that at
    # 9 mmHg 3.62 m/s is too slow to stay within 1.2 and 3.64 m/s is not
    network = straight(((2e-3, 1e-3), 0.1, VEIN, "v"))
    assert findings(network, {"vein": WallSettings(wave_speed=3.64)}, 9 * MMHG) == {}
    found = findings(network, {"vein": WallSettings(wave_speed=3.60)}, 9 * MMHG)
    assert set(found) == {"far from the reference state"}
    assert found["far from the reference state"].limit == 1.2
