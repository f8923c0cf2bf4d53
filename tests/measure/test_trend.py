"""Trend of the lash, cautions about a sheet, residual error, spring force."""

from __future__ import annotations

import datetime
import math
from decimal import Decimal

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from gcodetool.errors import SheetError
from gcodetool.inspection.lash_trend import sheet_cautions, trend
from gcodetool.inspection.residual import residual_axis, residual_part, residual_sentences
from gcodetool.inspection.spring_force import in_newtons, preload_and_friction
from gcodetool.machine import Axis
from gcodetool.sheet_edit import FormerLash

D = Decimal
TODAY = datetime.date(2025, 1, 1)


def value(days: int, lash: str, uncertainty: str | None = "0.01") -> FormerLash:
    size = None if uncertainty is None else D(uncertainty)
    return FormerLash(D(lash), size, TODAY + datetime.timedelta(days), "test")


@given(st.lists(st.tuples(st.integers(0, 3000), st.decimals(0, 1, places=3)), min_size=2, max_size=8))
def test_the_slope_against_numpy(points: list[tuple[int, Decimal]]) -> None:
    result = trend("X", [value(days, str(lash)) for days, lash in points])
    days = np.array([days for days, _ in points], float)
    if len(set(days)) < 2:
        assert result.per_year is None
        return
    (slope, _), covariance = np.polyfit(
        days / 365.25, [float(lash) for _, lash in points], 1, w=np.full(len(points), 1 / 0.005), cov="unscaled"
    )
    assert result.per_year == pytest.approx(slope, abs=1e-6)
    assert result.u_per_year == pytest.approx(math.sqrt(covariance[0, 0]), rel=1e-6)


def test_growth_is_told_only_beyond_the_uncertainty() -> None:
    assert "grows" in trend("X", [value(0, "0.10"), value(365, "0.15")]).verdict
    assert "no change" in trend("X", [value(0, "0.10"), value(365, "0.11")]).verdict
    assert "unknown" in trend("X", [value(0, "0.10"), value(365, "0.15", None)]).verdict
    less = trend("X", [value(0, "0.20"), value(300, "0.21"), value(400, "0.05")])
    assert f"by {TODAY + datetime.timedelta(400)}" in less.verdict


def test_values_without_a_date_tell_no_trend() -> None:
    result = trend("X", [FormerLash(D("0.1")), value(0, "0.2")])
    assert len(result.points) == 1
    assert result.per_year is None
    assert "one date" in result.verdict


def axis(**keys: object) -> Axis:
    known = {"lash": D("0.1"), "uncertainty": D("0.01"), "measured": TODAY}
    return Axis("X", **{**known, **keys})  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("given_axis", "days", "word"),
    [
        (axis(measured=None), 0, "measured"),
        (axis(), 181, "181 days ago"),
        (axis(), -1, "yet to come"),
        (axis(uncertainty=None), 0, "uncertainty"),
        (axis(uncertainty=D("0.1")), 0, "not larger"),
    ],
)
def test_cautions(given_axis: Axis, days: int, word: str) -> None:
    found = sheet_cautions([given_axis], TODAY + datetime.timedelta(days))
    assert len(found) == 1
    assert word in found[0]


def test_a_good_sheet_and_an_axis_without_lash_draw_no_caution() -> None:
    assert sheet_cautions([axis(), Axis("Y")], TODAY + datetime.timedelta(180)) == []
    assert sheet_cautions([axis()], TODAY + datetime.timedelta(31), most_days=30) != []


def test_the_residual_at_both_ends() -> None:
    """Bc = 0.10, true lash 0.08 to 0.12: up to 0.02 uncrossed or overshot; a circle of R 10 by B - Bc at both ends.

    Closed form (path radius R, lash B on both axes): the extent of the centre path is 2 R - B; with compensation Bc put
    B - Bc for B.
    """
    found = residual_axis(axis(uncertainty=D("0.02")))
    assert found is not None
    assert (found.lowest, found.highest) == (D("0.08"), D("0.12"))
    assert (found.too_little, found.too_much) == (D("0.02"), D("0.02"))
    extents = [20 - (true - D("0.1")) for true in (found.lowest, found.highest)]
    assert extents == [20 + found.too_much, 20 - found.too_little]


def test_the_residual_of_a_small_lash_stops_at_zero() -> None:
    found = residual_axis(axis(lash=D("0.01"), uncertainty=D("0.03")))
    assert found is not None
    assert (found.lowest, found.too_much, found.too_little, found.worst) == (0, D("0.01"), D("0.03"), D("0.03"))
    assert residual_axis(axis(uncertainty=None)) is None


def test_the_residual_of_the_part() -> None:
    axes = [
        found
        for letter, size in (("X", "0.03"), ("Y", "0.04"), ("A", "1"))
        if (found := residual_axis(Axis(letter, lash=D(1), uncertainty=D(size)))) is not None
    ]
    assert residual_part(axes) == D("0.05")
    assert residual_part([]) == 0
    sentences = residual_sentences(axes)
    assert len(sentences) == 4
    assert "0.97 to 1.03" in sentences[0]
    assert "degrees" in sentences[2]
    assert "0.0500 mm" in sentences[3]
    assert residual_sentences(axes[:1])[-1].startswith("axis X")
    exact = residual_axis(axis(uncertainty=D(0)))
    assert exact is not None
    assert "nothing is left" in residual_sentences([exact])[0]


def test_newtons() -> None:
    """1 kgf = 9.80665 N and 1 lbf = 4.4482216152605 N, exact by definition."""
    assert in_newtons([D(2)], "kgf") == [D("19.61330")]
    assert in_newtons([D(1)], "lbf") == [D("4.4482216152605")]
    with pytest.raises(SheetError, match="unit"):
        in_newtons([D(1)], "kg")
    with pytest.raises(SheetError, match="more than 0"):
        in_newtons([D(0)], "N")


def test_preload_is_what_is_left_of_the_jump_without_friction_on_the_safe_side() -> None:
    assert preload_and_friction([D(30), D(28)], [D(8), D("9.01")]) == (D("18.9"), D("8.0"))
    assert preload_and_friction([], [D("8.19")]) == (None, D("8.1"))
    with pytest.raises(SheetError, match="friction"):
        preload_and_friction([D(30)], [])
    with pytest.raises(SheetError, match="less than"):
        preload_and_friction([D(5)], [D(8)])
