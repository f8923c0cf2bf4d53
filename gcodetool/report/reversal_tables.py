"""Reversal statistics to rows of text and to JSON; no reading, no writing, no colour."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from gcodetool.lash.reversals import AxisReversals, Reversal

COLUMNS = (
    "axis", "on feed", "in arcs", "on rapids", "median travel", "shortest", "passed over", "take-ups",
    "range", "histogram",
)  # fmt: skip
LIST_COLUMNS = ("line", "axis", "position", "direction", "motion")
_BARS = " .:-=+*#%@"


def rows(axes: Sequence[AxisReversals]) -> list[tuple[str, ...]]:
    """One row of text per axis."""
    return [
        (
            axis.axis, str(axis.feed), str(axis.in_arcs), str(axis.rapid), _length(axis.median_travel),
            _length(axis.shortest_travel), str(axis.suppressed), str(axis.take_ups),
            f"{axis.low:.3f} to {axis.high:.3f}", histogram(axis.bins),
        )
        for axis in axes
    ]  # fmt: skip


def _length(value: float | None) -> str:
    return "-" if value is None else f"{value:.4f}"


def histogram(bins: Sequence[int]) -> str:
    """Counts as a row of characters, light to dark, the fullest the darkest."""
    most = max(bins, default=0) or 1
    return "[" + "".join(_BARS[-(-count * (len(_BARS) - 1) // most)] for count in bins) + "]"


def busiest_lines(axes: Sequence[AxisReversals]) -> list[str]:
    """The blocks with the most reversals, a line of text per axis that has any."""
    return [
        f"busiest blocks of {axis.axis}: " + ", ".join(f"line {line} ({count})" for line, count in axis.busiest)
        for axis in axes
        if axis.busiest
    ]


def list_row(reversal: Reversal) -> tuple[str, ...]:
    """One reversal as a row of text."""
    motion = "rapid" if reversal.rapid else "arc" if reversal.in_arc else "feed"
    sign = "+" if reversal.direction > 0 else "-"
    return str(reversal.line), reversal.axis, f"{reversal.position:.4f}", sign, motion


def as_json(axes: Sequence[AxisReversals]) -> list[dict[str, Any]]:
    """The statistics as plain data; lengths in mm, degrees on A B C."""
    return [
        {
            "axis": axis.axis,
            "feed": axis.feed,
            "in_arcs": axis.in_arcs,
            "rapid": axis.rapid,
            "take_ups": axis.take_ups,
            "suppressed": axis.suppressed,
            "seconds": axis.seconds,
            "median_travel": axis.median_travel,
            "shortest_travel": axis.shortest_travel,
            "low": axis.low,
            "high": axis.high,
            "bins": list(axis.bins),
            "busiest": [{"line": line, "reversals": count} for line, count in axis.busiest],
        }
        for axis in axes
    ]


def reversal_json(reversal: Reversal) -> dict[str, Any]:
    """One reversal as plain data."""
    return {
        "line": reversal.line,
        "axis": reversal.axis,
        "position": reversal.position,
        "direction": "+" if reversal.direction > 0 else "-",
        "rapid": reversal.rapid,
        "in_arc": reversal.in_arc,
    }
