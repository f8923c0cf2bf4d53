"""The uncertainty budget of the lash: JCGM 100 arithmetic, coverage by simulation, coupons, rounding."""

from __future__ import annotations

import math
import statistics
from decimal import Decimal

import numpy as np
import pytest
import scipy.stats
from hypothesis import given
from hypothesis import strategies as st

from gcodetool.errors import SheetError
from gcodetool.inspection import uncertainty
from gcodetool.inspection.iso230 import evaluate
from gcodetool.inspection.measure_records import Instrument, LashEstimate, Reading, ReadingSet

PERFECT = Instrument(misalignment=0)


def lash_of(cells: np.ndarray, instrument: Instrument = PERFECT) -> LashEstimate:
    """The lash of an array (targets, runs, 2), NaN where a reading is missing."""
    made = [
        Reading(float(i), run, 1 if side == 0 else -1, float(value), 0)
        for (i, run, side), value in np.ndenumerate(cells)
        if not np.isnan(value)
    ]
    data = ReadingSet("X", "mm", True, tuple(made))
    return uncertainty.lash_from_readings(evaluate(data), instrument, "test")


def rows(estimate: LashEstimate) -> dict[str, float]:
    return {row.name: row.u for row in estimate.budget}


def test_the_scatter_of_one_place_worked_by_hand() -> None:
    """Up -0.10 -0.11 -0.12, down 0.00 0.01 -0.01: both s = 0.01, so u = sqrt(2 * 0.0001 / 3) (JCGM 100, 4.2.3)."""
    estimate = lash_of(np.array([[[-0.10, 0.00], [-0.11, 0.01], [-0.12, -0.01]]]))
    assert estimate.signed == pytest.approx(-0.11)
    assert estimate.lash == pytest.approx(0.11)
    assert rows(estimate) == pytest.approx({"scatter of the readings": math.sqrt(2e-4 / 3)})
    assert estimate.uncertainty == pytest.approx(2 * math.sqrt(2e-4 / 3))
    assert estimate.freedom == pytest.approx(4)  # two equal parts of two degrees of freedom each
    assert estimate.factor == 2.78  # table G.2
    assert any("k = 2.78" in note for note in estimate.notes)
    assert any("one place" in note for note in estimate.notes)


def test_the_rows_of_the_indicator() -> None:
    """Rectangles (4.3.7): half a digit, the accuracy, twice each for the two readings; hysteresis once; cosine."""
    cells = np.array([[[0.0, 0.2], [0.0, 0.2]]])
    estimate = lash_of(cells, Instrument(resolution=0.01, accuracy=0.006, hysteresis=0.003, misalignment=10))
    assert list(rows(estimate).values()) == pytest.approx(
        [
            0.005 * math.sqrt(2 / 3),
            0.006 * math.sqrt(2 / 3),
            0.003 / math.sqrt(3),
            0.2 * (1 - math.cos(math.radians(10))) / math.sqrt(3),
        ]
    )
    assert estimate.uncertainty == pytest.approx(2 * math.sqrt(sum(u * u for u in rows(estimate).values())))
    assert estimate.freedom == math.inf
    assert not any("accuracy" in note for note in estimate.notes)


def test_an_accuracy_that_nobody_states_is_told() -> None:
    assert any("--accuracy" in note for note in lash_of(np.array([[[0.0, 0.2]]])).notes)
    assert any("read once" in note for note in lash_of(np.array([[[0.0, 0.2]]])).notes)


def test_a_change_along_the_travel_counts_in_full() -> None:
    """Two places that scatter by nothing and differ by 0.02: s = 0.02 / sqrt(2) for the lash met at either."""
    estimate = lash_of(np.array([[[0.0, 0.1], [0.0, 0.1]], [[0.0, 0.12], [0.0, 0.12]]]))
    assert estimate.lash == pytest.approx(0.11)
    assert rows(estimate) == pytest.approx({"change along the travel": 0.02 / math.sqrt(2)})
    assert estimate.freedom == 1


def test_no_change_is_charged_for_what_the_scatter_explains() -> None:
    cells = np.array([[[0.00, 0.10], [0.04, 0.14]], [[0.01, 0.10], [0.05, 0.14]]])
    assert "change along the travel" not in rows(lash_of(cells))


@pytest.mark.parametrize("varies", [0.0, 0.01])
def test_the_interval_covers_the_lash_of_a_simulated_machine(varies: float) -> None:
    """The lash met at one more place of the travel lies inside lash +- k u with the factor for 95 %."""
    source = np.random.default_rng(7)
    inside = 0
    for _ in range(400):
        places = 0.1 + varies * source.standard_normal(7)
        cells = 0.004 * source.standard_normal((6, 5, 2))
        cells[:, :, 0] -= places[:6, None]
        estimate = lash_of(cells)
        reach = estimate.factor * estimate.uncertainty / 2
        # A place drawn anew has the spread of the places on top of that of their mean: six places, factor 7/6.
        inside += abs(estimate.lash - places[6]) <= reach * math.sqrt(7 / 6)
    assert 0.92 <= inside / 400 <= 1.0


def test_student_factors_of_table_g_2_against_scipy() -> None:
    for freedom, factor in uncertainty.STUDENT:
        exact = scipy.stats.norm.ppf(0.975) if math.isinf(freedom) else scipy.stats.t.ppf(0.975, freedom)
        assert factor == pytest.approx(exact, abs=0.0055)
    assert uncertainty.student_factor(9.99) == 2.26
    assert uncertainty.student_factor(0.5) == math.inf
    assert uncertainty.student_factor(math.inf) == 1.960


def test_lash_that_is_not_larger_than_its_uncertainty_is_none() -> None:
    cells = np.array([[[0.0, 0.004], [0.01, 0.014], [-0.01, -0.006]]])
    estimate = lash_of(cells)
    assert not estimate.shown
    assert estimate.lash == 0
    value, spread = uncertainty.rounded(estimate)
    assert value == 0
    assert float(spread) >= 0.004 + estimate.uncertainty


def test_no_target_read_from_both_sides_is_an_error() -> None:
    with pytest.raises(SheetError, match="both sides"):
        lash_of(np.array([[[0.1, np.nan]]]))


def test_vernier_by_hand() -> None:
    """Line 7 of 0.02: 0.14, a rectangle of one line to either side: u = 0.02 / sqrt(3)."""
    estimate = uncertainty.lash_from_vernier("X", [7], 0.02)
    assert estimate.lash == pytest.approx(0.14)
    assert estimate.uncertainty == pytest.approx(2 * 0.02 / math.sqrt(3))
    looks = uncertainty.lash_from_vernier("X", [7, 8, 7], 0.02)
    assert looks.lash == pytest.approx(0.02 * 22 / 3)
    assert rows(looks)["scatter of 3 looks"] == pytest.approx(0.02 * statistics.stdev([7, 8, 7]) / math.sqrt(3))
    none = uncertainty.lash_from_vernier("Y", [0], 0.02)
    assert (none.lash, none.shown) == (0.0, False)


def test_vernier_below_zero_is_refused_beyond_a_slip_of_the_eye() -> None:
    assert uncertainty.lash_from_vernier("X", [-1], 0.02).lash == 0
    with pytest.raises(SheetError, match="swapped"):
        uncertainty.lash_from_vernier("X", [-5], 0.02)
    with pytest.raises(SheetError, match="line"):
        uncertainty.lash_from_vernier("X", [], 0.02)


def test_tongues_by_hand() -> None:
    """Wide and narrow differ by two lashes; accuracy 0.02 on both widths, halved: u = 0.02 sqrt(2/3) / 2."""
    estimate = uncertainty.lash_from_tongues("X", wide=[8.11], same=[8.0], narrow=[7.89], resolution=0)
    assert estimate.lash == pytest.approx(0.11)
    assert estimate.uncertainty == pytest.approx(0.02 * math.sqrt(2 / 3))
    assert estimate.notes == ()
    single = uncertainty.lash_from_tongues("X", wide=[8.11], same=[8.0], resolution=0)
    assert single.lash == pytest.approx(0.11)
    assert single.uncertainty == pytest.approx(2 * 0.02 * math.sqrt(2 / 3))
    other = uncertainty.lash_from_tongues("X", same=[8.0], narrow=[7.89])
    assert other.lash == pytest.approx(0.11)


@given(
    st.floats(0.06, 2),
    st.floats(-0.3, 0.3),
    st.sampled_from([("wide", "narrow"), ("wide", "same"), ("same", "narrow")]),
)
def test_the_cutter_drops_out_of_the_tongues(lash: float, cutter: float, kinds: tuple[str, str]) -> None:
    widths = {"wide": 8 + lash - cutter, "same": 8 - cutter, "narrow": 8 - lash - cutter}
    given_widths = {kind: [widths[kind]] for kind in kinds}
    estimate = uncertainty.lash_from_tongues("X", **{"wide": (), **given_widths})
    assert estimate.lash == pytest.approx(lash, abs=1e-9)


def test_tongues_that_contradict_each_other_are_told() -> None:
    estimate = uncertainty.lash_from_tongues("X", wide=[8.30], same=[8.0], narrow=[7.89])
    assert any("do not agree" in note for note in estimate.notes)


@pytest.mark.parametrize("widths", [{"wide": []}, {"wide": [8.1]}, {"wide": [], "same": [8.0]}])
def test_one_kind_of_tongue_is_not_enough(widths: dict[str, list[float]]) -> None:
    with pytest.raises(SheetError):
        uncertainty.lash_from_tongues("X", **widths)


def test_swapped_tongues_are_refused() -> None:
    with pytest.raises(SheetError, match="swapped"):
        uncertainty.lash_from_tongues("X", wide=[7.8], narrow=[8.2])


@given(st.floats(0.001, 1.9), st.floats(1e-7, 0.5))
def test_rounding_for_the_sheet(lash: float, spread: float) -> None:
    """Two figures of the uncertainty, upwards (7.2.6); the lash to the same place; never finer than the grid."""
    estimate = LashEstimate("X", "mm", -lash, lash, spread, True, math.inf, 1.96, (), "test")
    value, size = uncertainty.rounded(estimate)
    assert spread <= float(size) <= max(1.1 * spread, spread + 1e-4) + 1e-12
    assert value.as_tuple().exponent == size.as_tuple().exponent
    assert size.as_tuple().exponent >= -4
    assert abs(float(value) - lash) <= float(Decimal(1).scaleb(size.as_tuple().exponent)) / 2 + 1e-12
