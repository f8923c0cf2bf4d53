"""An audit -> rows of tables, lines of text, plain data for JSON.

Lengths are mm, times s in the data and minutes in the text, forces N; what is not known is shown as a dash.
"""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Sequence
from enum import Enum
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from gcodetool.inspection.audit_records import Audit, Feature, Finding, Measure, MoveRow

Rows = list[tuple[str, ...]]
SCHEMA = 1

FINDING_COLUMNS = ("severity", "code", "line", "what", "what to do")
SHARE_COLUMNS = ("tool", "cut", "length mm", "of length", "time s", "of time")
AXIS_COLUMNS = ("axis", "held mm", "doubtful mm", "dragged mm", "unknown mm", "worst", "at line", "what holds it")
SIZE_COLUMNS = ("feature", "lines", "figure", "intended", "uncompensated", "compensated", "range compensated")
ENVELOPE_COLUMNS = ("axis", "lowest", "highest", "travel", "compared")
MOVE_COLUMNS = (
    "line", "motion", "cut", "length", "from deg", "to deg", "width", "depth", "removed", "fz", "mean chip",
    "force along", "force left", "X", "Y", "Z",
)  # fmt: skip


def number(value: float | None, decimals: int) -> str:
    """A number for a table; a dash for what is not known, and no minus in front of zero."""
    if value is None or not math.isfinite(value):
        return "-"
    return f"{round(value, decimals) + 0.0:.{decimals}f}"


def finding_rows(findings: Sequence[Finding]) -> Rows:
    """One row for each finding; line 0 is the whole program."""
    return [
        (str(each.severity), str(each.code), str(each.line) if each.line else "-", each.text, each.action)
        for each in findings
    ]


def share_rows(audit: Audit) -> Rows:
    """Length and time by label and tool."""
    return [
        (
            "any" if each.tool == "*" else f"T{each.tool}", each.label, number(each.length, 1),
            f"{100 * each.share_of_length:.1f} %", number(each.time, 1), f"{100 * each.share_of_time:.1f} %",
        )
        for each in audit.shares
    ]  # fmt: skip


def flip_lines(audit: Audit, most: int = 12) -> list[str]:
    """Where contours change between climb and conventional, in a line of text."""
    if not audit.flips:
        return []
    shown = ", ".join(f"{new} from line {line}" for _, line, _, new in audit.flips[:most])
    rest = f", and {len(audit.flips) - most} more" if len(audit.flips) > most else ""
    return [f"changes inside a contour: {shown}{rest}"]


def axis_rows(audit: Audit) -> Rows:
    """What the cut does to each axis that has lash."""
    return [
        (
            each.axis, number(each.held, 1), number(each.doubtful, 1), number(each.dragged, 1), number(each.unknown, 1),
            f"{100 * min(each.worst_ratio, 99.0):.0f} %", str(each.worst_line or "-"), each.threshold,
        )
        for each in audit.axes
    ]  # fmt: skip


def size_rows(features: Sequence[Feature], tolerance: float = 0.0) -> Rows:
    """The figures of each feature, as many as are off by more than ``tolerance``, at least its worst one."""
    rows: Rows = []
    for feature in features:
        name, lines = feature.name, _lines(feature.lines)
        for measure in _shown(feature, tolerance):
            rows.append((
                name, lines, measure.name, number(measure.intended, 3), number(measure.before, 3),
                number(measure.after, 3), f"{number(measure.low, 3)} to {number(measure.high, 3)}",
            ))  # fmt: skip
            name = lines = ""
    return rows


def _shown(feature: Feature, tolerance: float) -> list[Measure]:
    off = [each for each in feature.measures if max(abs(each.error_before), abs(each.error_after)) > tolerance]
    return off or [max(feature.measures, key=lambda each: abs(each.error_before))]


def _lines(lines: tuple[int, int]) -> str:
    return str(lines[0]) if lines[0] == lines[1] else f"{lines[0]}-{lines[1]}"


def envelope_rows(audit: Audit) -> Rows:
    """The commanded range of each axis beside its travel."""
    return [
        (
            each.axis, number(each.low, 3), number(each.high, 3),
            "-" if each.travel is None else f"{each.travel[0]:g} to {each.travel[1]:g}",
            "-" if each.travel is None else "place and size" if each.placed else "size only",
        )
        for each in audit.envelope
    ]  # fmt: skip


def time_lines(audit: Audit) -> list[str]:
    """The time of the job, with and without take-ups."""
    times = audit.durations
    whole = times.feed + times.rapid
    lines = [f"at programmed feeds {clock(whole)} ({clock(times.feed)} of it feed motion)"]
    if times.stop_to_stop is not None:
        lines.append(f"stopping after every block {clock(times.stop_to_stop)}; the truth lies between")
    if times.take_ups:
        lines.append(
            f"take-ups: {times.take_ups}, which add {clock(times.take_up_time)}: {clock(whole + times.take_up_time)}"
        )
    return [*lines, *times.said]


def clock(seconds: float) -> str:
    """Seconds as minutes and seconds."""
    minutes, rest = divmod(round(seconds), 60)
    return f"{minutes} min {rest:02d} s" if minutes else f"{seconds:.1f} s"


def basis_lines(audit: Audit) -> list[str]:
    """What the audit rests on: stock, tools, material, and every assumption."""
    stock = audit.stock
    bottom = "not said" if stock.bottom is None else f"Z{stock.bottom:g}"
    lines = [f"stock: {_extent(stock.outline)}, top Z{stock.top:g}, bottom {bottom}"]
    lines += [f"cutter: {each}" for each in audit.tools]
    if audit.material is not None:
        lines.append(f"material: {audit.material.name} (source: {audit.material.source})")
    return [*lines, *audit.assumptions]


def _extent(outline: Sequence[tuple[float, float]]) -> str:
    if not outline:
        return "none, since nothing is cut"
    x, y = [point[0] for point in outline], [point[1] for point in outline]
    return f"X{min(x):.3f} to {max(x):.3f}, Y{min(y):.3f} to {max(y):.3f}"


def move_row(row: MoveRow) -> tuple[str, ...]:
    """One feed motion as a row of text."""
    cut = f"{row.label} (rubs)" if row.spring else row.label
    return (
        str(row.line), row.kind, cut, number(row.length, 3), number(row.first_angle, 1), number(row.last_angle, 1),
        number(row.width, 3), number(row.depth, 3), number(row.removed, 3), number(row.chip_load, 4),
        number(row.mean_chip, 4), number(row.along, 2), number(row.side, 2), *(row.holds.get(a, "-") for a in "XYZ"),
    )  # fmt: skip


def as_json(audit: Audit) -> dict[str, Any]:
    """The whole audit as plain data; what is not known is None."""
    data: dict[str, Any] = {"schema": SCHEMA, "units": "mm"}
    data.update((field.name, _plain(getattr(audit, field.name))) for field in dataclasses.fields(audit))
    data["flips"] = [{"after": before, "line": line, "from": old, "to": new} for before, line, old, new in audit.flips]
    data["durations"].pop("by_move")
    for row, feature in zip(data["features"], audit.features, strict=True):
        row["worst_before"], row["worst_after"] = feature.worst, feature.worst_after
    return data


def _plain(value: Any) -> Any:
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, Enum):
        return str(value)
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {field.name: _plain(getattr(value, field.name)) for field in dataclasses.fields(value)}
    if isinstance(value, dict):
        return {str(key): _plain(item) for key, item in value.items()}
    if isinstance(value, tuple | list):
        return [_plain(item) for item in value]
    return value
