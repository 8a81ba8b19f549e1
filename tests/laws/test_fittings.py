"""Losses of narrowings against worked values, limits and invariances; ρ = 1060 kg/m³ unless said otherwise."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from geomprep.errors import InputError
from geomprep.laws import fittings, lumped
from geomprep.laws.fittings import LAWS, Loss, Narrowing
from geomprep.literature import row

RHO, MU = 1060.0, 4e-3
MMHG = 133.322387415
# Young & Tsai 1973, Seeley & Young 1976; from MEMORY
YOUNG_TSAI = {"length_share": 0.83, "diameter_share": 1.64, "expansion": 1.52, "inertia": 1.2}
LIMITS = {
    **{key: YOUNG_TSAI[parameter] for parameter, key in LAWS["Young and Tsai"].published},
    "narrowing-least-degree-dogs": 0.523,
    "narrowing-most-degree-dogs": 0.922,
    "narrowing-least-reynolds": 75.0,
    "narrowing-most-reynolds": 500.0,
    "expansion-laminar-reynolds-hooper-1988": 4000.0,
    "pipe-laminar-reynolds": 2300.0,
}


FloatArray = np.ndarray


def circle(diameter: float) -> float:
    return math.pi * diameter**2 / 4


def tube(before: float, throat: float | FloatArray, beyond: float, length: float) -> Narrowing:
    """Areas in m²; friction and inertance are those of a round throat of the whole length."""
    friction = lumped.resistance_from_area(length / np.square(throat), MU, 2.0)
    return Narrowing(length, before, throat, beyond, friction, lumped.inertance(length / np.asarray(throat), RHO))


def worked() -> Narrowing:
    """D₀ 4 mm, D_s 2 mm and √8 mm (half the area), 10 mm long."""
    return tube(circle(4e-3), np.array([circle(2e-3), circle(4e-3) / 2]), circle(4e-3), 0.01)


def losses(narrowing: Narrowing) -> dict[str, Loss]:
    return {name: fittings.loss_by(name, narrowing, RHO, MU, LIMITS) for name in LAWS}


def test_young_tsai_worked_by_hand() -> None:
    # Q = 5 mL/s: U = 0.397887 m/s; l_a = 0.83·10 + 1.64·2 = 11.58 mm and 0.83·10 + 1.64·√8 = 12.93862 mm;
    # K_v = 32 (l_a/4)(A₀/A_s)² = 1482.24 and 414.0359; K_v μU/D₀ = 589.765 and 164.740 Pa;
    # 1.52·530·U²·(4 − 1)² = 1147.842 and (2 − 1)² 127.538 Pa
    loss = fittings.young_tsai(worked(), RHO, MU, **YOUNG_TSAI)
    assert loss.viscous * 5e-6 == pytest.approx([589.765, 164.740], rel=4e-6)
    assert loss.quadratic * 25e-12 == pytest.approx([1147.842, 127.538], rel=2e-6)
    assert loss.viscous[0] == pytest.approx(1.179529e8, rel=1e-6)
    assert loss.quadratic[0] == pytest.approx(4.591369e13, rel=1e-6)
    assert fittings.pressure_loss(loss, 5e-6)[0] / MMHG == pytest.approx(13.0332, rel=1e-5)
    # 1.2·1060·0.01/(4π·1e-6): of the vessel's area, not the throat's
    assert loss.inertial == pytest.approx(2 * [1.2 * 1060 * 0.01 / (4 * math.pi * 1e-6)], rel=1e-12)


def test_young_tsai_as_published() -> None:
    # the equation with its own symbols K_v, K_t, K_u, at U = 0.3 m/s and dU/dt = 2 m/s²
    narrowing, speed, rate, d0, length = worked(), 0.3, 2.0, 4e-3, 0.01
    area = narrowing.area_before
    ratio = area / narrowing.area_throat
    k_v = 32 * (0.83 * length + 1.64 * d0 / np.sqrt(ratio)) / d0 * ratio**2
    expected = k_v * MU / d0 * speed + 1.52 * RHO / 2 * (ratio - 1) ** 2 * speed**2 + 1.2 * RHO * length * rate
    loss = fittings.loss_by("Young and Tsai", narrowing, RHO, MU, LIMITS)
    assert fittings.pressure_loss(loss, speed * area, rate * area) == pytest.approx(expected, rel=1e-12)
    # the vessel beyond has no part in it
    wider = fittings.loss_by("Young and Tsai", replace(narrowing, area_beyond=3 * area), RHO, MU, LIMITS)
    assert fittings.pressure_loss(wider, speed * area, rate * area) == pytest.approx(expected, rel=1e-12)


def test_borda_carnot_worked_by_hand() -> None:
    # A_s/A₂ = 1/4 and U_s = 0.6 m/s: 530·0.36·(3/4)² = 107.325 Pa; the vessel before plays no part
    for before in (4e-6, 9e-6):
        loss = fittings.borda_carnot(tube(before, 1e-6, 4e-6, 0.01), RHO)
        assert loss.quadratic * (0.6e-6) ** 2 == pytest.approx([107.325], rel=1e-12)


def test_dynamic_pressure_of_a_narrowed_sinus() -> None:
    # ½ρ(Q/A)² by hand: 350 mL/min through 20 mm² is 0.2916667 m/s, 45.087 Pa = 0.34 mmHg; 4 and 16 times that
    # through 10 and 5 mm². Poiseuille of 10 mm at 4 mPa·s: 8π·4e-3·0.01/A²·Q = 14.66 Pa = 0.11 mmHg through 20 mm²
    narrowing = tube(80e-6, np.array([20e-6, 10e-6, 5e-6]), 80e-6, 0.01)
    loss = fittings.dynamic_pressure(narrowing, RHO)
    for flow, whole, friction in [
        (350e-6 / 60, [0.34, 1.35, 5.4], [0.11, 0.44, 1.8]),
        (600e-6 / 60, [1.0, 4.0, 15.9], [0.19, 0.75, 3.0]),
    ]:
        assert loss.quadratic * flow**2 / MMHG == pytest.approx(whole, rel=0.007)
        assert loss.viscous * flow / MMHG == pytest.approx(friction, rel=0.025)


def test_laws_with_an_expansion_differ_by_its_factor() -> None:
    # same area before and beyond: K_t times Borda-Carnot, and (1 − A_s/A₂)² of the whole dynamic pressure
    found = losses(worked())
    borda = found["Borda-Carnot"].quadratic
    assert found["Young and Tsai"].quadratic == pytest.approx(1.52 * borda, rel=1e-12)
    assert borda == pytest.approx([0.75**2, 0.5**2] * found["dynamic pressure"].quadratic, rel=1e-12)


def test_no_narrowing_no_expansion() -> None:
    # a throat as wide as its vessel: Borda-Carnot is friction alone, Young and Tsai has friction only
    found = losses(tube(3e-6, 3e-6, 3e-6, 0.02))
    for name in ("Borda-Carnot", "Young and Tsai", "friction alone"):
        assert found[name].quadratic == 0
    assert found["Borda-Carnot"].viscous == found["friction alone"].viscous > 0


@pytest.mark.parametrize("name", list(LAWS))
def test_nothing_is_counted_twice(name: str) -> None:
    # a segment of 30 mm at 4 mm², 10 mm at 1 mm² and 20 mm at 4 mm²; its sums with the stretch in them
    area, length = np.array([4e-6, 1e-6, 4e-6]), np.array([0.03, 0.01, 0.02])
    resistance = 8 * math.pi * MU * (length / area**2).sum()
    inertance = RHO * (length / area).sum()
    narrowing = tube(4e-6, 1e-6, 4e-6, 0.01)
    loss = losses(narrowing)[name]
    # what is left to the segment: friction of 50 mm at 4 mm²
    assert resistance - loss.replaced_friction == pytest.approx([8 * math.pi * MU * 0.05 / 16e-12], rel=1e-12)
    with_inertance = name == "Young and Tsai"
    rest = RHO * 0.05 / 4e-6 if with_inertance else inertance
    assert inertance - loss.replaced_inertance == pytest.approx([rest], rel=1e-12)
    assert (loss.inertial > 0) == with_inertance
    # the other laws hold exactly the stretch's own Poiseuille part; Young and Tsai put l_a = 0.83 l + 1.64 D_s for l
    share = (0.83 * 0.01 + 1.64 * math.sqrt(4e-6 / math.pi)) / 0.01 if with_inertance else 1.0
    assert loss.viscous == pytest.approx(share * loss.replaced_friction, rel=1e-12)


def test_turned_narrowing_expands_to_the_other_side() -> None:
    # towards 2 mm²: (1 − 1/2)² = 1/4; back towards 4 mm²: (1 − 1/4)² = 9/16 of ρ/(2 A_s²)
    narrowing = tube(4e-6, 1e-6, 2e-6, 0.01)
    whole = RHO / 2 / 1e-12
    assert fittings.borda_carnot(narrowing, RHO).quadratic == pytest.approx([whole / 4], rel=1e-12)
    assert fittings.borda_carnot(narrowing.turned(), RHO).quadratic == pytest.approx([whole * 9 / 16], rel=1e-12)
    assert narrowing.degree_by_area == pytest.approx([0.75])
    assert narrowing.turned().degree_by_area == pytest.approx([0.5])


def test_largest_changes_with_the_degree() -> None:
    # quadratic terms are as 1.52 d² : 1, equal at d = 1/√1.52 = 0.8111; made large by the flow
    throat = np.array([0.25, 0.17]) * 10e-6
    flow = 1e-3
    found = losses(tube(10e-6, throat, 10e-6, 0.01))
    answer = fittings.spread(found, flow)
    assert answer.largest_by == ("dynamic pressure", "Young and Tsai")
    by_hand = np.array([RHO / 2, 1.52 * RHO / 2 * 0.83**2]) * (flow / throat) ** 2
    assert answer.largest == pytest.approx(by_hand, rel=0.01)
    assert answer.spread == pytest.approx(answer.largest - found["friction alone"].viscous * flow, rel=1e-12)


def test_spread_of_one_law_and_of_no_flow() -> None:
    found = losses(worked())
    assert fittings.spread({"Borda-Carnot": found["Borda-Carnot"]}, 1e-6).spread.tolist() == [0.0, 0.0]
    assert fittings.spread(found, [0.0, 0.0]).largest.tolist() == [0.0, 0.0]
    # one flow for each narrowing
    each = fittings.spread(found, [1e-6, -2e-6]).largest
    assert each[0] == fittings.spread(found, 1e-6).largest[0]
    assert each[1] == fittings.spread(found, 2e-6).largest[1]
    with pytest.raises(InputError, match="no law of narrowings to compare"):
        fittings.spread({}, 1e-6)


AREAS = st.floats(1e-7, 1e-3)
RATIOS = st.floats(0.01, 1.0)


@given(AREAS, RATIOS, RATIOS, st.floats(0.1, 30), st.floats(1e-7, 1e-4), st.floats(0.1, 10))
def test_losses_of_similar_vessels(
    before: float, narrow: float, beyond: float, diameters: float, flow: float, scale: float
) -> None:
    # lengths and flow times s keep the Reynolds number; Δp then goes with ρU², or s⁻²
    length = diameters * math.sqrt(before)
    throat, after = before * narrow, before * narrow / beyond
    small = losses(tube(before, throat, after, length))
    large = losses(tube(before * scale**2, throat * scale**2, after * scale**2, length * scale))
    for name in LAWS:
        loss = fittings.pressure_loss(small[name], flow)
        assert fittings.pressure_loss(large[name], flow * scale) == pytest.approx(loss / scale**2, rel=1e-6, abs=1e-12)
        assert fittings.pressure_loss(small[name], -flow) == pytest.approx(-loss, rel=1e-15)
        assert (loss > 0).all()


def test_rows_do_not_mix_and_times_stand_before_them() -> None:
    loss = losses(worked())["Young and Tsai"]
    flow = np.array([[1e-6, 2e-6], [-3e-6, 4e-6], [0.0, 5e-6]])
    together = fittings.pressure_loss(loss, flow, 1e-5)
    assert together.shape == (3, 2)
    for which in (0, 1):
        alone = tube(circle(4e-3), float(worked().area_throat[which]), circle(4e-3), 0.01)
        expected = fittings.pressure_loss(losses(alone)["Young and Tsai"], flow[:, [which]], 1e-5)[:, 0]
        assert together[:, which] == pytest.approx(expected, rel=1e-12)


def texts(name: str, narrowing: Narrowing, flow: float, vessel_class: str = "artery") -> tuple[tuple[str, ...], ...]:
    return fittings.range_texts(name, narrowing, flow, RHO, MU, vessel_class, LIMITS)


def test_young_tsai_inside_and_outside_its_range() -> None:
    # 75 % and 50 % by area; Re of the vessel 4ρQ/(πD₀μ) = 421.8 at 5 mL/s
    inside, shallow = texts("Young and Tsai", worked(), 5e-6)
    assert inside == ()
    assert shallow == ("degree by area 0.5 lies below 0.523 (tried in arteries of dogs)",)
    # 8 and 0.8 mL/s: 674.8 and 67.48; 5 % of the area left is 95 %
    deep = tube(circle(4e-3), 0.05 * circle(4e-3), circle(4e-3), 0.01)
    assert texts("Young and Tsai", deep, -8e-6) == (
        (
            "degree by area 0.95 lies above 0.922 (tried in arteries of dogs)",
            "Reynolds number before 674.8 lies above 500 (later comparisons of such laws)",
        ),
    )
    assert texts("Young and Tsai", worked(), 0.8e-6)[0] == (
        "Reynolds number before 67.48 lies below 75 (later comparisons of such laws)",
    )


@pytest.mark.parametrize("vessel_class", ["vein", "any"])
def test_young_tsai_in_veins(vessel_class: str) -> None:
    wrong, shallow = texts("Young and Tsai", worked(), 5e-6, vessel_class)
    told = f"'Young and Tsai' was tested in vessels of class artery; this one is of class {vessel_class}"
    assert wrong == (told,)
    assert shallow[0] == told and len(shallow) == 2


def test_reynolds_number_in_the_throat() -> None:
    # 4ρQ/(πD_sμ): 843.5 in 2 mm and 596.5 in √8 mm at 5 mL/s; ten times that at 50 mL/s
    assert texts("friction alone", worked(), 5e-6, "vein") == ((), ())
    assert texts("friction alone", worked(), 50e-6)[1] == (
        "Reynolds number in the throat 5965 lies above 2300 (laminar flow in a straight pipe)",
    )
    assert texts("Borda-Carnot", worked(), 5e-6)[0] == (
        "Reynolds number in the throat 843.5 lies below 4000 (flat profiles; a laminar jet loses more)",
    )
    assert texts("Borda-Carnot", worked(), 50e-6) == ((), ())
    assert texts("dynamic pressure", worked(), 50e-6, "vein") == ((), ())


def test_ends_of_a_range_belong_to_it() -> None:
    narrowing = tube(1.0, np.array([0.25, 0.75]), 1.0, 1.0)
    limits = {**LIMITS, "narrowing-least-degree-dogs": 0.25, "narrowing-most-degree-dogs": 0.75}
    limits |= {"narrowing-least-reynolds": 0.0}
    assert fittings.range_texts("Young and Tsai", narrowing, 0.0, RHO, MU, "artery", limits) == ((), ())


def test_laws_say_what_they_are() -> None:
    for name, law in LAWS.items():
        assert law.equation.startswith("dp = R_v Q") and law.source
        assert {parameter for parameter, _ in law.published} <= set(law.parameters)
        # what the function takes in fact, no more and no less
        known = {"density": RHO, "viscosity": MU, **YOUNG_TSAI}
        direct = law.function(worked(), **{parameter: known[parameter] for parameter in law.parameters})
        np.testing.assert_array_equal(direct.quadratic, losses(worked())[name].quadratic)
        for end in (end for limit in law.limits for end in (limit.least, limit.most) if end):
            without = {key: value for key, value in LIMITS.items() if key != end}
            with pytest.raises(InputError, match=f"the value of '{end}' is missing"):
                fittings.range_texts(name, worked(), 1e-6, RHO, MU, "artery", without)


def test_literature_rows_of_the_laws() -> None:
    # every key that a law names has its row; the literals above say what it holds
    keys = {key for law in LAWS.values() for _, key in law.published}
    keys |= {end for law in LAWS.values() for limit in law.limits for end in (limit.least, limit.most) if end}
    assert keys == set(LIMITS)
    for key in keys:
        assert row(key).value == pytest.approx(LIMITS[key], rel=1e-14)
        assert row(key).quantity == "number"
    for _, key in LAWS["Young and Tsai"].published:
        assert (row(key).checked, row(key).confidence, row(key).vessel_class) == ("memory", "high", "artery")
        assert row(key).doi in LAWS["Young and Tsai"].source
    for key in ("narrowing-least-degree-dogs", "narrowing-most-reynolds", "expansion-laminar-reynolds-hooper-1988"):
        assert row(key).checked == "seen"
    assert row("pipe-laminar-reynolds").checked == "common practice"
    # Hooper's laminar expansion loses more than Borda-Carnot, which is why the limit is there:
    # at D₁/D₂ = 1/2, 2 (1 − 1/16) = 1.875 against (1 − 1/4)² = 0.5625 of the dynamic pressure
    ratio = 0.5
    quadratic = fittings.borda_carnot(tube(1.0, ratio**2, 1.0, 1.0), RHO).quadratic
    assert quadratic / (RHO / 2 / ratio**4) == pytest.approx([0.5625], rel=1e-12)


def test_impossible_numbers_are_refused() -> None:
    with pytest.raises(InputError, match=r"area_throat = 5e-06 m2 \(number 1\) is wider than .* = 4e-06 m2"):
        Narrowing(0.01, 4e-6, np.array([1e-6, 5e-6]), 6e-6, 1e8, 1e6)
    with pytest.raises(InputError, match="is wider than area_before or area_beyond = 3e-06"):
        Narrowing(0.01, 8e-6, 4e-6, 3e-6, 1e8, 1e6)
    with pytest.raises(InputError, match="length = 0"):
        Narrowing(0.0, 4e-6, 1e-6, 4e-6, 1e8, 1e6)
    with pytest.raises(InputError, match="friction = nan"):
        Narrowing(0.01, 4e-6, 1e-6, 4e-6, math.nan, 1e6)
    with pytest.raises(InputError, match="there are length 3, area_before 1, area_throat 2"):
        Narrowing(np.full(3, 0.01), 4e-6, np.full(2, 1e-6), 4e-6, 1e8, 1e6)
    with pytest.raises(InputError, match="'orifice' is unknown; choose one of Young and Tsai, Borda-Carnot"):
        fittings.loss_by("orifice", worked(), RHO, MU, LIMITS)
    with pytest.raises(InputError, match="'narrowing-length-share-seeley-young-1976' is missing"):
        fittings.loss_by("Young and Tsai", worked(), RHO, MU, {})
    with pytest.raises(InputError, match="density = -1"):
        fittings.dynamic_pressure(worked(), -1.0)
    with pytest.raises(InputError, match="viscosity = 0"):
        fittings.young_tsai(worked(), RHO, 0.0, **YOUNG_TSAI)


def test_no_narrowings_and_no_changes() -> None:
    nothing = Narrowing(np.zeros(0), 4e-6, 1e-6, 4e-6, 1e8, 1e6)
    assert fittings.pressure_loss(losses(nothing)["Young and Tsai"], 1e-6).shape == (0,)
    assert texts("Young and Tsai", nothing, 1e-6) == ()
    with pytest.raises(ValueError, match="read-only"):
        worked().length[0] = 1.0
