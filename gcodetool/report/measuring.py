"""Measured lash -> rows of tables, plain-text charts, plain dictionaries for JSON.

Lengths are mm, or degrees for a rotary axis, as in the records; None is shown as a dash.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from decimal import Decimal
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from gcodetool.inspection.measure_records import Evaluation, Finding, LashEstimate, Target, Trend
    from gcodetool.sheet_edit import FormerLash

Rows = list[tuple[str, ...]]
CHART = 52  # columns of the chart's own field; with its labels it stays below 80

TARGET_COLUMNS = ("i", "target", "n up", "n down", "mean up", "mean down", "B_i", "s up", "s down", "R_i")
TARGET_CLAUSES = ("", "", "", "", "2.10", "2.10", "2.12", "2.15", "2.15", "2.17")
FIGURE_COLUMNS = ("figure", "clause", "value", "name")
BUDGET_COLUMNS = ("source of error", "kind", "u", "freedom")
TREND_COLUMNS = ("measured", "lash", "uncertainty", "method")


def number(value: float | None, decimals: int, *, sign: bool = False) -> str:
    """A number for a table; a dash for None, and no minus in front of zero."""
    if value is None:
        return "-"
    return f"{round(value, decimals) + 0.0:{'+' if sign else ''}.{decimals}f}"


def decimals_for(evaluation: Evaluation) -> int:
    """Four decimals, five where all deviations lie below 0.02."""
    largest = max(abs(mean) for mean in _means(evaluation))
    return 5 if largest < 0.02 else 4


def _means(evaluation: Evaluation) -> list[float]:
    means = [mean for target in evaluation.targets for mean in (target.mean_up, target.mean_down)]
    return [mean for mean in means if mean is not None]


def target_rows(evaluation: Evaluation) -> Rows:
    """One row per target under TARGET_COLUMNS; the first row names the clauses of ISO 230-2:2006."""
    places = decimals_for(evaluation)
    return [TARGET_CLAUSES, *(_target_row(target, places) for target in evaluation.targets)]


def _target_row(target: Target, places: int) -> tuple[str, ...]:
    return (
        str(target.index),
        f"{target.position:.3f}",
        str(target.n_up),
        str(target.n_down),
        number(target.mean_up, places, sign=True),
        number(target.mean_down, places, sign=True),
        number(target.reversal, places, sign=True),
        number(target.s_up, places),
        number(target.s_down, places),
        number(target.repeatability, places),
    )


def figure_rows(evaluation: Evaluation) -> Rows:
    """One row per figure of the axis, with the clause that defines it; what compares targets only where it can."""
    places = decimals_for(evaluation)
    return [
        (figure.symbol, figure.clause, number(figure.value, places, sign=figure.symbol == "B mean"), figure.name)
        for figure in evaluation.figures
        if evaluation.common_zero or figure.symbol[0] in "BR"
    ]


def budget_rows(lash: LashEstimate) -> Rows:
    """One row per contribution, and the combined uncertainty in the last."""
    rows = [(row.name, row.kind, _two_figures(row.u), _freedom(row.freedom)) for row in lash.budget]
    return [*rows, ("combined", "", _two_figures(lash.uncertainty / 2), _freedom(lash.freedom))]


def _two_figures(value: float) -> str:
    """Two significant figures, as uncertainties are stated (JCGM 100, 7.2.6), never in powers of ten."""
    return f"{Decimal(f'{value:.1e}'):f}"


def _freedom(freedom: float) -> str:
    return "-" if math.isinf(freedom) else f"{freedom:.3g}"


def lash_sentences(lash: LashEstimate) -> list[str]:
    """The result in words: the lash, its uncertainty, and what the budget leaves out."""
    if lash.shown:
        first = f"lash of {lash.axis}: {lash.lash:.4f} {lash.unit} +- {lash.uncertainty:.4f} {lash.unit} (k = 2)"
    else:
        first = f"lash of {lash.axis}: none shown; less than {_bound(lash):.4f} {lash.unit} (k = 2)"
    return [first, *(f"note: {note}" for note in lash.notes)]


def _bound(lash: LashEstimate) -> float:
    return lash.uncertainty + max(0.0, -lash.signed)


def chart(evaluation: Evaluation) -> list[str]:
    """A chart of the two directions in plain text: > mean up, < mean down, - two standard deviations, : zero.

    One pair of lines per target; at most 79 columns.
    """
    targets = drawn_targets(evaluation)
    low, high = _span(targets)
    lines = [f"{'target':>10}      {low:<+12.4f}{'deviation, ' + evaluation.unit:^{CHART - 24}}{high:>+12.4f}"]
    for target in targets:
        up = _strip(target.mean_up, target.s_up, ">", low, high)
        down = _strip(target.mean_down, target.s_down, "<", low, high)
        lines += [f"{target.position:10.3f} up   {up}".rstrip(), f"{'':10} down {down}".rstrip()]
    return lines


def drawn_targets(evaluation: Evaluation) -> tuple[Target, ...]:
    """The targets as charts show them: about their own mean where the indicator was set anew at each."""
    if evaluation.common_zero:
        return evaluation.targets
    return tuple(_about_its_mean(target) for target in evaluation.targets)


def _about_its_mean(target: Target) -> Target:
    known = [mean for mean in (target.mean_up, target.mean_down) if mean is not None]
    centre = sum(known) / len(known) if known else 0.0
    up, down = (None if mean is None else mean - centre for mean in (target.mean_up, target.mean_down))
    return replace(target, mean_up=up, mean_down=down)


def _span(targets: Sequence[Target]) -> tuple[float, float]:
    """Lowest and highest value to be drawn, zero among them; never empty."""
    edges = [0.0]
    for target in targets:
        for mean, s in ((target.mean_up, target.s_up), (target.mean_down, target.s_down)):
            if mean is not None:
                edges += [mean - 2 * (s or 0.0), mean + 2 * (s or 0.0)]
    low, high = min(edges), max(edges)
    return (low, high) if high > low else (low - 0.001, high + 0.001)


def _strip(mean: float | None, s: float | None, mark: str, low: float, high: float) -> str:
    """One line of the chart."""
    cells = [" "] * CHART

    def column(value: float) -> int:
        return round((value - low) / (high - low) * (CHART - 1))

    cells[column(0.0)] = ":"
    if mean is not None:
        for place in range(column(mean - 2 * (s or 0.0)), column(mean + 2 * (s or 0.0)) + 1):
            cells[place] = "-"
        cells[column(mean)] = mark
    return "".join(cells)


def trend_rows(trend: Trend, undated: Sequence[FormerLash] = ()) -> Rows:
    """One row per value, oldest first; those without a date before all others."""
    return [
        (
            str(value.measured or "-"),
            f"{value.lash:f}",
            "-" if value.uncertainty is None else f"{value.uncertainty:f}",
            value.method or "-",
        )
        for value in (*undated, *trend.points)
    ]


def trend_sentence(trend: Trend) -> str:
    """The trend in words."""
    if trend.per_year is None:
        return f"trend of {trend.axis}: {trend.verdict}"
    spread = "" if trend.u_per_year is None else f" +- {2 * trend.u_per_year:.4f}"
    unit = "degrees" if trend.axis in "ABC" else "mm"
    return f"trend of {trend.axis}: {trend.per_year:+.4f}{spread} {unit} per year; {trend.verdict}"


def evaluation_json(evaluation: Evaluation, lash: LashEstimate, findings: Sequence[Finding]) -> dict[str, Any]:
    """Everything of one evaluation as plain values; what is None or infinite becomes null."""
    return {
        "axis": evaluation.axis,
        "unit": evaluation.unit,
        "common_zero": evaluation.common_zero,
        "targets": [_plain(target) for target in evaluation.targets],
        "figures": [_plain(figure) for figure in evaluation.figures],
        "lash": lash_json(lash),
        "findings": [_plain(finding) for finding in findings],
    }


def lash_json(lash: LashEstimate) -> dict[str, Any]:
    """A measured lash as plain values; ``k`` is the coverage factor of its uncertainty."""
    return {**_plain(lash), "k": 2, "budget": [_plain(row) for row in lash.budget], "notes": list(lash.notes)}


def trend_json(trend: Trend) -> dict[str, Any]:
    """A trend as plain values; dates as ISO 8601, lash and uncertainty as numbers."""
    points = [
        {
            "measured": str(point.measured),
            "lash": float(point.lash),
            "uncertainty": None if point.uncertainty is None else float(point.uncertainty),
            "method": point.method,
        }
        for point in trend.points
    ]
    return {**_plain(trend), "points": points}


def _plain(record: Any) -> dict[str, Any]:
    """The fields of a record; nested records are left to the caller."""
    values = {name: getattr(record, name) for name in record.__slots__}
    return {name: _finite(list(value) if isinstance(value, tuple) else value) for name, value in values.items()}


def _finite(value: Any) -> Any:
    return None if isinstance(value, float) and not math.isfinite(value) else value
