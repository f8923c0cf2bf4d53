"""The mean cutting force against direct integration, closed forms, published examples; and what holds an axis against
it.

Coefficients: review of milling force models for aluminium alloys, Chin. J. Mech. Eng. 2021, table 5, doi
10.1186/s10033-021-00536-9.
"""

from __future__ import annotations

import math
from decimal import Decimal

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad
from scipy.optimize import brentq

from gcodetool.inspection.cutting_records import Cutters, Hold, Label
from gcodetool.inspection.force import advice, coefficients, forces, hold, largest_sine, mean_chip, mean_force
from gcodetool.inspection.job_records import Cutter, Material
from gcodetool.inspection.materials import DEFAULTS, as_sheet, material_named
from gcodetool.inspection.outlines import box
from gcodetool.machine import Axis
from tests.audit.conftest import HEAD, look

PI = math.pi
AL6082 = material_named("aluminium-6082")
AL7075 = material_named("aluminium-7075")


def force_of(material: Material, first: float, last: float, height: float, load: float, flutes: float):
    """(along, left, axial, tangential) of one engagement."""
    one = np.array([first]), np.array([last]), np.array([height]), np.array([load]), np.array([flutes])
    chip = mean_chip(one[3], one[0], one[1])
    return tuple(float(part[0]) for part in mean_force(*one, coefficients(material, chip)))


def theta(share: float) -> float:
    return math.acos(1.0 - 2.0 * share)


def up(share: float) -> tuple[float, float]:
    return 0.0, theta(share)


def down(share: float) -> tuple[float, float]:
    return PI - theta(share), PI


def direct(material: Material, first: float, last: float, height: float, load: float, flutes: float) -> list[float]:
    """The same by integrating the force of a tooth over a turn, written out anew."""
    kt, kr, ka = material.kt, material.kr, material.ka

    def tooth(phi: float, k: int) -> float:
        chip = load * math.sin(phi)
        tangential = (kt * chip + material.et) * height
        radial = (kr * chip + material.er) * height
        return [
            -tangential * math.cos(phi) - radial * math.sin(phi),
            tangential * math.sin(phi) - radial * math.cos(phi),
            (ka * chip + material.ea) * height,
            tangential,
        ][k]

    return [flutes / (2 * PI) * quad(tooth, first, last, args=(k,))[0] for k in range(4)]


# Case S: D 3, one flute, ap 0.5, fz 0.02; case L: D 6, two flutes, ap 2, fz 0.05.  Figures by direct integration, N.
CASE_S = [(0.10, -0.974, -0.217, 0.629, 0.795, 0.230), (0.25, -1.719, 0.077, 0.826, 1.574, 0.451),
          (0.50, -2.456, 0.949, 0.617, 2.698, 0.784), (0.75, -2.665, 2.073, -0.120, 3.569, 1.118)]  # fmt: skip
CASE_L = [("aluminium-6082", 0.10, -10.112, -1.090, 7.050, 7.684, 2.885),
          ("aluminium-6082", 0.50, -27.160, 16.109, 9.478, 31.993, 11.490),
          ("aluminium-7075", 0.10, -18.801, -5.605, 11.149, 16.650, 1.700),
          ("aluminium-7075", 0.25, -34.544, -0.366, 14.310, 32.995, 4.000),
          ("aluminium-7075", 0.50, -50.996, 17.189, 8.688, 56.430, 7.766),
          ("aluminium-6061", 0.25, -10.663, -0.892, 3.459, 10.451, 0.0)]  # fmt: skip


@pytest.mark.parametrize(("share", "ux", "uy", "dx", "dy", "axial"), CASE_S)
def test_small_cutter(share, ux, uy, dx, dy, axial) -> None:
    assert force_of(AL6082, *up(share), 0.5, 0.02, 1)[:3] == pytest.approx((ux, uy, axial), abs=6e-4)
    assert force_of(AL6082, *down(share), 0.5, 0.02, 1)[:3] == pytest.approx((dx, dy, axial), abs=6e-4)


@pytest.mark.parametrize(("name", "share", "ux", "uy", "dx", "dy", "axial"), CASE_L)
def test_larger_cutter(name, share, ux, uy, dx, dy, axial) -> None:
    material = material_named(name)
    assert force_of(material, *up(share), 2.0, 0.05, 2)[:3] == pytest.approx((ux, uy, axial), abs=6e-4)
    assert force_of(material, *down(share), 2.0, 0.05, 2)[:3] == pytest.approx((dx, dy, axial), abs=6e-4)


def test_slots_have_their_closed_form() -> None:
    """Fx = -z ap (Krc fz/4 + Kre/pi), Fy = z ap (Ktc fz/4 + Kte/pi), Fz = z ap (Kac fz/pi + Kae/2)."""
    found = force_of(AL6082, 0.0, PI, 0.5, 0.02, 1)
    assert found[:3] == pytest.approx((-1.839, 3.647, 1.569), abs=6e-4)
    z, ap, fz, m = 1, 0.5, 0.02, AL6082
    assert found[:3] == pytest.approx((
        -z * ap * (m.kr * fz / 4 + m.er / PI), z * ap * (m.kt * fz / 4 + m.et / PI),
        z * ap * (m.ka * fz / PI + m.ea / 2),
    ))  # fmt: skip
    assert force_of(AL6082, 0.0, PI, 2.0, 0.05, 2)[:3] == pytest.approx((-17.682, 48.102, 22.980), abs=6e-4)
    assert force_of(AL7075, 0.0, PI, 2.0, 0.05, 2)[:3] == pytest.approx((-42.308, 73.619, 15.533), abs=6e-4)


# round numbers: Kt 600, Kr 180, no edge, two flutes, ap 1, fz 0.1
ROUND = Material("round", "a test", kt=600.0, kr=180.0)
ROUND_ROWS = [(0.1, -3.9061, 0.5300, 2.9694, 2.5926), (0.25, -8.9215, 3.7164, 5.4025, 8.0136),
              (0.5, -14.0493, 12.1352, 5.0493, 17.8648), (0.75, -14.4025, 21.9864, -0.0785, 26.2836)]  # fmt: skip


@pytest.mark.parametrize(("share", "ux", "uy", "dx", "dy"), ROUND_ROWS)
def test_round_numbers_and_the_closed_forms_in_theta(share, ux, uy, dx, dy) -> None:
    assert force_of(ROUND, *up(share), 1.0, 0.1, 2)[:2] == pytest.approx((ux, uy), abs=6e-5)
    assert force_of(ROUND, *down(share), 1.0, 0.1, 2)[:2] == pytest.approx((dx, dy), abs=6e-5)
    t, c = theta(share), 2 * 1.0 * 0.1 / (8 * PI)
    plain, double = 1 - math.cos(2 * t), 2 * t - math.sin(2 * t)
    assert (ux, uy) == pytest.approx((-c * (600 * plain + 180 * double), c * (600 * double - 180 * plain)), abs=6e-5)
    assert (dx, dy) == pytest.approx((c * (600 * plain - 180 * double), c * (600 * double + 180 * plain)), abs=6e-5)


def test_half_immersions_of_both_senses_add_up_to_the_slot() -> None:
    one, other = (force_of(ROUND, *side(0.5), 1.0, 0.1, 2) for side in (up, down))
    slot = force_of(ROUND, 0.0, PI, 1.0, 0.1, 2)
    assert [a + b for a, b in zip(one, other, strict=True)] == pytest.approx(slot)
    assert slot[:2] == pytest.approx((-9.0, 30.0))


angle = st.floats(0.0, PI)
rows = st.sampled_from(["aluminium-6082", "aluminium-7075", "aluminium-7075-hss"])


@given(rows, angle, angle, st.floats(0.1, 5.0), st.floats(0.005, 0.2), st.integers(1, 4))
def test_any_engagement_agrees_with_direct_integration(name, first, last, height, load, flutes) -> None:
    material = material_named(name)
    first, last = sorted((first, last))
    expected = direct(material, first, last, height, load, flutes)
    assert force_of(material, first, last, height, load, flutes) == pytest.approx(expected, rel=1e-6, abs=1e-6)


@given(rows, angle, angle, st.floats(0.1, 5.0), st.floats(0.005, 0.2))
def test_force_times_speed_is_the_power_of_the_chip_and_of_the_edge(name, first, last, height, load) -> None:
    """Ft vc = ap ae vf Ktc + z ap Kte (ex - st) / (2 pi) vc, exactly; ae is the width swept by the engagement."""
    material = material_named(name)
    first, last = sorted((first, last))
    flutes, radius, speed = 2, 3.0, 10_000.0
    cutting_speed = 2 * PI * radius * speed / 60e3
    feed = load * flutes * speed / 60.0
    width = radius * (math.cos(first) - math.cos(last))
    tangential = force_of(material, first, last, height, load, flutes)[3]
    chip = height * width * feed * material.kt * 1e-3
    edge = flutes * height * material.et * (last - first) / (2 * PI) * cutting_speed
    assert tangential * cutting_speed == pytest.approx(chip + edge, rel=1e-9, abs=1e-9)


def test_the_power_of_a_slot() -> None:
    """Aluminium 6082, D 6, two flutes, ap 2, fz 0.05, 10 000 rpm: 126.20 W of chip and 81.68 W of edge."""
    tangential = force_of(AL6082, 0.0, PI, 2.0, 0.05, 2)[3]
    assert tangential * PI * 6.0 * 10_000 / 60e3 == pytest.approx(207.88, abs=0.01)


def test_the_published_force_and_power_example() -> None:
    """El-Hofy, Fundamentals of Machining Processes, 2nd ed., p. 189: slab of D 30 in a slot, 8 teeth, 4 deep, fz 0.1,
    120 mm/min, ks 1000 N/mm^2: 150 rpm, 14.13 m/min, mean tangential force 1019 N, 0.24 kW."""
    material = Material("example", "El-Hofy p. 189", kt=1000.0, kr=300.0)
    speed = 120.0 / (8 * 0.1)
    assert speed == pytest.approx(150.0)
    metres = PI * 30.0 * speed / 1000.0
    assert metres == pytest.approx(14.13, abs=0.01)
    tangential = force_of(material, 0.0, PI, 4.0, 0.1, 8)[3]
    assert tangential == pytest.approx(1019.0, abs=1.0)
    assert tangential * metres / 60e3 == pytest.approx(0.24, abs=0.001)


@pytest.mark.parametrize(
    ("ratio", "share"),
    [(0.1, 0.918), (0.2, 0.832), (0.3, 0.747), (0.4, 0.666), (0.5, 0.591), (0.7, 0.462), (1.0, 0.322)],
)
def test_climb_stops_feeding_itself_at_a_width_that_depends_on_the_radial_share_only(
    ratio: float, share: float
) -> None:
    material = Material("", "", kt=600.0, kr=600.0 * ratio)
    crossing = brentq(lambda x: force_of(material, *down(x), 1.0, 0.1, 2)[0], 0.01, 0.999)
    assert crossing == pytest.approx(share, abs=6e-4)


@pytest.mark.parametrize(("ratio", "share"), [(0.2, 0.022), (0.3, 0.047), (0.5, 0.118), (1.0, 0.322)])
def test_conventional_turns_from_pushing_off_to_pulling_in(ratio: float, share: float) -> None:
    material = Material("", "", kt=600.0, kr=600.0 * ratio)
    crossing = brentq(lambda x: force_of(material, *up(x), 1.0, 0.1, 2)[1], 1e-4, 0.9)
    assert crossing == pytest.approx(share, abs=6e-4)


# ---- the chip ------------------------------------------------------------------------------------------------------

# ae/D, theta in degrees, largest chip / fz, thinning factor, mean chip / fz (computed from the formulas beside it)
CHIPS = [(0.02, 16.26, 0.2800, 3.5714, 0.1409), (0.05, 25.84, 0.4359, 2.2942, 0.2217),
         (0.10, 36.87, 0.6, 1.6667, 0.3108),
         (0.125, 41.41, 0.6614, 1.5119, 0.3459), (0.2, 53.13, 0.8, 1.25, 0.4314), (0.25, 60.0, 0.8660, 1.1547, 0.4775),
         (0.3, 66.42, 0.9165, 1.0911, 0.5176), (0.4, 78.46, 0.9798, 1.0206, 0.5842), (0.5, 90.0, 1, 1, 0.6366),
         (0.75, 120.0, 1, 1, 0.7162), (1.0, 180.0, 1, 1, 0.6366)]  # fmt: skip


@pytest.mark.parametrize(("share", "degrees", "largest", "thinning", "mean"), CHIPS)
def test_chip_thickness(share, degrees, largest, thinning, mean) -> None:
    assert math.degrees(theta(share)) == pytest.approx(degrees, abs=0.006)
    for first, last in (up(share), down(share)):
        top = float(largest_sine(np.array([first]), np.array([last]))[0])
        assert top == pytest.approx(largest, abs=6e-5)
        assert 1 / top == pytest.approx(thinning, abs=6e-5)
        assert float(mean_chip(np.array([1.0]), np.array([first]), np.array([last]))[0]) == pytest.approx(
            mean, abs=6e-5
        )
    if share < 0.5:
        assert thinning == pytest.approx(1 / (2 * math.sqrt(share * (1 - share))), abs=6e-5)


def test_mean_chip_of_a_handbook_example() -> None:
    """Handbook: fz 0.0083 in, ae 4.72, D 6.30, engagement 97 degrees, lead 45 degrees: mean chip 0.0052 in."""
    half = math.radians(97.0) / 2
    chip = float(mean_chip(np.array([0.0083]), np.array([PI / 2 - half]), np.array([PI / 2 + half]))[0])
    assert chip * math.sin(math.radians(45.0)) == pytest.approx(0.0052, abs=5e-5)


# ---- Kienzle -------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("name", "chip", "expected"),
    [
        ("aluminium", 0.005, 2632), ("aluminium", 0.01, 2214), ("aluminium", 0.02, 1861), ("aluminium", 0.1, 1245),
        ("aluminium-hard", 0.02, 2127), ("brass", 0.02, 2013), ("steel", 0.01, 3551), ("steel", 0.1, 2189),
    ],
)  # fmt: skip
def test_specific_force_of_the_groups(name: str, chip: float, expected: float) -> None:
    """kc = kc1.1 h^-mc with the values of VDI 3323 groups; mild steel at 0.1 mm: a handbook table says 2200 (0.5 %
    apart)."""
    assert float(coefficients(material_named(name), np.array([chip]))[0][0]) == pytest.approx(expected, abs=1.0)


def test_the_shortcut_with_the_mean_chip_is_within_ten_percent() -> None:
    """Integrating kc1.1 h^(1-mc) exactly against the specific force taken at the mean chip; D 3, ap 0.5, fz 0.02."""
    material = material_named("aluminium")
    for first, last in ((0.0, PI), down(0.1), up(0.5)):
        for k in (0, 1):

            def tooth(phi: float, k: int = k) -> float:
                chip = 0.02 * math.sin(phi)
                kt = material.kc11 * max(chip, 1e-12) ** -material.mc
                t, r = kt * chip * 0.5, 0.3 * kt * chip * 0.5
                return (-t * math.cos(phi) - r * math.sin(phi), t * math.sin(phi) - r * math.cos(phi))[k]

            exact = quad(tooth, first, last)[0] / (2 * PI)
            assert force_of(material, first, last, 0.5, 0.02, 1)[k] == pytest.approx(exact, rel=0.1)


def test_the_handbook_power_example() -> None:
    """Handbook: ap 2, ae 80, vf 280, kc 1800, efficiency 0.8: 1.68 kW at the motor."""
    material = Material("", "", kt=1800.0, kr=500.0)
    radius, flutes, speed = 125.0, 12, 1000.0 * 80.0 / (PI * 250.0)
    load = 280.0 / (flutes * speed)
    half = math.asin(40.0 / radius)
    tangential = force_of(material, PI / 2 - half, PI / 2 + half, 2.0, load, flutes)[3]
    assert tangential * 80.0 / 60.0 / 0.8 / 1000.0 == pytest.approx(1.68, abs=0.005)


def test_every_default_has_a_source_a_band_and_a_table_to_edit() -> None:
    for material in DEFAULTS.values():
        assert len(material.source) > 10
        assert 0.0 < material.low < 1.0 < material.high
        assert (material.kt is None) != (material.kc11 is None)
        assert material.source in as_sheet(material)


# ---- programs ------------------------------------------------------------------------------------------------------


def test_force_along_a_program_is_that_of_its_engagement_turned_into_the_axes() -> None:
    """One-sided cut of 0.25 D along +X, -X, +Y and at 30 degrees; climb and conventional."""
    for degrees in (0.0, 180.0, 90.0, 30.0):
        for sign in (1.0, -1.0):
            ux, uy = math.cos(math.radians(degrees)), math.sin(math.radians(degrees))
            edge, far = sign * 1.5, sign * 60.0
            corners = [(s * ux - e * uy, s * uy + e * ux) for s, e in ((-30, edge), (30, edge), (30, far), (-30, far))]
            seen = look(
                f"G21 G90\nS10000 M3\nF1000\nG0 X{-40 * ux:.5f} Y{-40 * uy:.5f} Z5\nG0 Z-2\n"
                f"G1 X{40 * ux:.5f} Y{40 * uy:.5f}\n",
                6.0, tuple(corners),
            )  # fmt: skip
            k = seen.at(6)
            power = forces(
                seen.path,
                Cutters.of((Cutter("*", 6.0),)),
                seen.engagement.samples,
                seen.engagement.slices,
                seen.cut,
                AL7075,
            )
            along, left = force_of(AL7075, *(up if sign > 0 else down)(0.25), 2.0, 0.05, 2)[:2]
            assert (power.along[k], power.side[k]) == pytest.approx((along, left), rel=1e-3)
            assert (power.fx[k], power.fy[k]) == pytest.approx(
                (along * ux - left * uy, along * uy + left * ux), rel=1e-3
            )
            assert power.chip_load[k] == pytest.approx(0.05)


def test_a_left_hand_cutter_is_the_mirror_image() -> None:
    stock = box(-30.0, 1.5, 30.0, 60.0)
    program = HEAD + "G0 X-40 Y0 Z5\nG0 Z-2\nG1 X40\n"
    found = []
    for hand, shape in ((1, box(-30.0, -60.0, 30.0, -1.5)), (-1, stock)):
        seen = look(program, 6.0, shape, hand=hand)
        cutters = Cutters.of((Cutter("*", 6.0, hand=hand),))
        power = forces(seen.path, cutters, seen.engagement.samples, seen.engagement.slices, seen.cut, AL6082)
        found.append((power.along[seen.at(6)], power.side[seen.at(6)]))
    assert found[0] == pytest.approx((found[1][0], -found[1][1]), rel=1e-6)


def test_the_peak_of_a_tooth() -> None:
    """Case S: 14.14 N in a slot, 11.7 N at 0.1 D."""
    for stock, expected in ((box(-30.0, -60.0, 30.0, 60.0), 14.14), (box(-30.0, 1.2, 30.0, 60.0), 11.7)):
        seen = look("G21 G90\nS10000 M3\nF200\nG0 X-40 Y0 Z5\nG0 Z-0.5\nG1 X40\n", 3.0, stock, flutes=1)
        cutters = Cutters.of((Cutter("*", 3.0, flutes=1),))
        power = forces(seen.path, cutters, seen.engagement.samples, seen.engagement.slices, seen.cut, AL6082)
        assert power.peak[seen.at(6)] == pytest.approx(expected, abs=0.06)


# ---- what holds an axis --------------------------------------------------------------------------------------------


def verdict(axis: Axis, force: float, way: float) -> tuple[Hold, float, int]:
    found = hold(axis, np.array([force]), np.array([way]), np.array([True]))
    return Hold(int(found.verdict[0])), float(found.ratio[0]), int(found.push[0])


def axis(**values: object) -> Axis:
    return Axis("X", lash=Decimal("0.1"), **values)


@pytest.mark.parametrize(
    ("force", "way", "expected"),
    [
        (4.0, 1.0, (Hold.HELD, 0.4, 0)), (6.0, 1.0, (Hold.DOUBTFUL, 0.6, 0)), (12.0, 1.0, (Hold.DRAGGED, 1.2, 1)),
        (-12.0, 1.0, (Hold.HELD, 0.0, 0)), (-12.0, -1.0, (Hold.DRAGGED, 1.2, -1)), (12.0, -1.0, (Hold.HELD, 0.0, 0)),
        (-12.0, 0.0, (Hold.DRAGGED, 1.2, -1)), (4.0, 0.0, (Hold.HELD, 0.4, 0)),
    ],
)  # fmt: skip
def test_a_plain_nut_is_dragged_along_its_motion_only(force, way, expected) -> None:
    found = verdict(axis(friction=10), force, way)
    assert found == (expected[0], pytest.approx(expected[1]), expected[2])


@pytest.mark.parametrize(
    ("force", "way", "ratio"),
    [(-30.0, -1.0, 30 / 25), (-30.0, 1.0, 30 / 15), (-30.0, 0.0, 30 / 25), (30.0, 1.0, 0.0), (-10.0, -1.0, 10 / 25)],
)
def test_a_spring_nut_gives_way_from_its_stiff_side_only(force, way, ratio) -> None:
    """Preload 20 N, friction 5 N, stiff side +: it opens towards minus, friction helping (25 N) or working with the
    cut (15 N)."""
    assert verdict(axis(friction=5, preload=20, stiff_side=1), force, way)[1] == pytest.approx(ratio)
    assert verdict(axis(friction=5, preload=20, stiff_side=-1), -force, -way)[1] == pytest.approx(ratio)


def test_a_spring_weaker_than_the_friction_opens_by_itself() -> None:
    assert verdict(axis(friction=20, preload=10, stiff_side=1), 0.0, 1.0)[0] is Hold.DRAGGED
    assert verdict(axis(friction=20, preload=10, stiff_side=1), 0.0, -1.0)[0] is Hold.HELD


def test_what_is_not_known_is_said() -> None:
    assert verdict(axis(), 5.0, 1.0)[0] is Hold.UNKNOWN
    assert verdict(axis(friction=10), math.nan, 1.0)[0] is Hold.UNKNOWN
    assert verdict(Axis("X", friction=1), 5.0, 1.0)[0] is Hold.HELD  # no lash to cross


def test_advice_names_what_would_help() -> None:
    assert "conventional" in advice(Label.CLIMB, 1.3)
    assert "conventional" not in advice(Label.SLOT, 1.3)
    assert "38 %" in advice(Label.SLOT, 1.3)
