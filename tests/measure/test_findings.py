"""What the findings name, and how often they are wrong."""

from __future__ import annotations

import math

import numpy as np
import pytest
import scipy.stats
from hypothesis import given
from hypothesis import strategies as st

from gcodetool.inspection import readings_findings as rf
from gcodetool.inspection import uncertainty
from gcodetool.inspection.iso230 import evaluate
from gcodetool.inspection.measure_records import Finding, Instrument, Reading, ReadingSet
from tests.measure.conftest import published

PLACES = (3.0, 14.0, 31.0, 40.0, 58.0)


def data_of(cells: np.ndarray) -> ReadingSet:
    """Readings on lines 1, 2, 3 ... in the order target, run, up before down; NaN where one is missing."""
    made = []
    for line, ((i, run, side), value) in enumerate(np.ndenumerate(cells), 1):
        if not np.isnan(value):
            made.append(Reading(PLACES[i], run + 1, 1 if side == 0 else -1, float(value), line))
    return ReadingSet("X", "mm", True, tuple(made), int(np.isnan(cells).sum()))


def findings_of(data: ReadingSet, resolution: float = 0.0) -> list[Finding]:
    result = evaluate(data)
    lash = uncertainty.lash_from_readings(result, Instrument(resolution=resolution), "test")
    return rf.findings(data, result, lash, resolution)


def codes(data: ReadingSet, resolution: float = 0.0) -> set[int]:
    return {finding.code for finding in findings_of(data, resolution)}


def machine(lash: float = 0.1, noise: float = 0.002, seed: int = 1, runs: int = 5) -> np.ndarray:
    cells = noise * np.random.default_rng(seed).standard_normal((5, runs, 2))
    cells[:, :, 0] -= lash
    return cells


def test_a_good_set_draws_no_word() -> None:
    assert codes(data_of(machine())) == set()


def test_false_words_are_rare() -> None:
    """Each test takes 5 % over the whole set: of 300 good sets about 15 for each, far below 30."""
    counts = dict.fromkeys((rf.OUTLIER, rf.POSITION, rf.DRIFT), 0)
    for seed in range(300):
        for code in codes(data_of(machine(seed=seed))) & counts.keys():
            counts[code] += 1
    assert all(3 <= count <= 30 for count in counts.values()), counts


def test_an_outlier_is_named_and_kept() -> None:
    cells = machine()
    cells[2, 3, 1] += 0.03
    data = data_of(cells)
    named = [finding for finding in findings_of(data) if finding.code == rf.OUTLIER]
    assert [finding.lines for finding in named] == [(2 * 10 + 3 * 2 + 2,)]
    assert "run 4, down, target 31" in named[0].text
    assert evaluate(data).targets[2].mean_down == pytest.approx(cells[2, :, 1].mean())


def test_two_readings_in_a_cell_cannot_name_an_outlier() -> None:
    cells = machine(runs=2)
    cells[0, 0, 0] += 5
    assert rf.OUTLIER not in codes(data_of(cells))


def test_lash_that_changes_along_the_travel_is_told_with_its_places() -> None:
    cells = machine()
    cells[1, :, 0] -= 0.02
    named = [finding.text for finding in findings_of(data_of(cells)) if finding.code == rf.POSITION]
    assert len(named) == 1
    assert "at 14" in named[0]


def test_a_coarse_dial_is_no_change_along_the_travel() -> None:
    """All readings alike to the last digit, one place reads a digit more: that may be rounding."""
    cells = np.zeros((5, 5, 2))
    cells[:, :, 0] = -0.10
    cells[2, :, 0] = -0.11
    assert rf.POSITION not in codes(data_of(cells), resolution=0.01)
    assert rf.POSITION in codes(data_of(cells), resolution=0.0001)


def test_no_lash() -> None:
    assert rf.NO_LASH in codes(data_of(machine(lash=0.0002)))
    assert rf.NO_LASH in codes(published("a"))
    assert rf.NO_LASH not in codes(published("b"))


def test_all_directions_swapped() -> None:
    data = data_of(machine()[:, :, ::-1])
    found = {finding.code: finding.text for finding in findings_of(data)}
    assert set(found) == {rf.SWAPPED_ALL}
    assert "swapped" in found[rf.SWAPPED_ALL]
    assert "sign" in found[rf.SWAPPED_ALL]


@given(st.integers(0, 4), st.integers(0, 4), st.integers(0, 50))
def test_one_swapped_pair_is_named(target: int, run: int, seed: int) -> None:
    cells = machine(seed=seed)
    cells[target, run] = cells[target, run, ::-1].copy()
    named = [finding for finding in findings_of(data_of(cells)) if finding.code == rf.SWAPPED_SOME]
    assert [finding.lines for finding in named] == [(target * 10 + run * 2 + 1, target * 10 + run * 2 + 2)]


def test_scatter_about_no_lash_is_no_swap() -> None:
    assert all(rf.SWAPPED_SOME not in codes(data_of(machine(lash=0.001, seed=seed))) for seed in range(30))


def test_warming_up_is_told() -> None:
    cells = machine()
    cells += 0.004 * np.arange(5)[None, :, None]
    assert rf.DRIFT in codes(data_of(cells))


def test_missing_rows_and_a_target_of_one_side_are_told() -> None:
    cells = machine()
    cells[0, 0, 0] = np.nan
    cells[4, :, 1] = np.nan
    texts = [finding.text for finding in findings_of(data_of(cells)) if finding.code == rf.MISSING]
    assert texts[0].startswith("rows of the form left empty: 6")
    assert "target 58" in texts[1]


def test_less_than_the_standard_asks_for_is_told() -> None:
    assert rf.FEW in codes(data_of(machine(runs=4)))
    assert rf.FEW in codes(data_of(machine()[:4]))


def test_equal_steps_are_told() -> None:
    assert rf.EQUAL in codes(published("a"))
    assert rf.EQUAL not in codes(published("b"))


def test_one_reading_of_each_kind_is_evaluated() -> None:
    assert codes(data_of(np.array([[[0.0, 0.1]]]))) == {rf.FEW}


@given(st.floats(0.51, 0.999999), st.integers(1, 200))
def test_student_quantile_against_scipy(probability: float, freedom: int) -> None:
    assert rf.t_quantile(probability, freedom) == pytest.approx(scipy.stats.t.ppf(probability, freedom), rel=1e-7)


def test_student_quantile_without_freedom_is_infinite() -> None:
    assert rf.t_quantile(0.975, 0) == math.inf
