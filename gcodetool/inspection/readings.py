"""Readings form (CSV text) -> readings in mm or degrees.

A form has comment lines ``# key = value``, a heading, and one row per reading.  The unit stands in the heading:
``run,direction,target_mm,indicator_mm``.  The column of values says what they are:

position_*    where the axis really was, on one scale for the whole travel
deviation_*   actual position minus target, on one scale for the whole travel
indicator_*   what the dial showed; it was set anew at each target, so only differences at one target mean anything

``_mm _um _in _thou _deg`` are the units.  Columns of other names are left unread.  A semicolon may separate the
columns, and then a comma may be the decimal mark.  Text after ``#`` is a comment.
"""

from __future__ import annotations

import csv
import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from decimal import Decimal, InvalidOperation

from gcodetool.errors import Refusal
from gcodetool.inspection.measure_records import Instrument, Reading, ReadingSet
from gcodetool.machine import LETTERS, ROTARY

SCALES: Mapping[str, Decimal] = {
    "mm": Decimal(1), "um": Decimal("0.001"), "in": Decimal("25.4"), "thou": Decimal("0.0254"), "deg": Decimal(1),
}  # fmt: skip
KINDS = ("position", "deviation", "indicator")
UP = ("up", "+", "plus", "forward", "1", "+1")
DOWN = ("down", "-", "minus", "backward", "-1")
EMPTY = ("", "-", "?", "x", "na", "n/a", "nan", "none", "missing")
LARGEST = 50.0  # mm or degrees: a larger deviation is a slip of the pen or of the unit


@dataclass(frozen=True, slots=True)
class _Columns:
    """Where the columns stand; scales turn a written value into mm or degrees."""

    run: int
    direction: int
    target: int
    value: int
    target_scale: Decimal
    value_scale: Decimal
    value_unit: str
    kind: str
    separator: str


@dataclass(frozen=True, slots=True)
class _Row:
    line: int
    cells: tuple[str, ...]
    separator: str

    @property
    def text(self) -> str:
        return self.separator.join(self.cells)

    def cell(self, place: int) -> str:
        """The text in that column, empty where the row is shorter."""
        return self.cells[place] if place < len(self.cells) else ""


def read_readings(text: str, *, axis: str | None = None, radius: float | None = None) -> ReadingSet:
    """The readings of one axis in mm, or degrees for A B C.

    ``axis`` and ``radius`` replace the form's ``# axis = X`` and ``# radius = 50``; the radius in mm is the distance
    of the indicator from the centre of a rotary axis, and turns its mm into degrees.  ``# sign = -`` says that the
    dial falls when the axis moves towards plus.  Raises Refusal with line, words, reason and way out.
    """
    text = text.removeprefix("\ufeff")
    facts, rows = _facts(text), list(_rows(text))
    if not rows:
        raise Refusal(1, "(empty)", "there is no reading", "Fill in the form that measure indicator writes")
    columns = _columns(rows[0])
    letter = _axis(axis or facts.get("axis", ""), rows[0].line)
    factor = _sign(columns, facts, rows[0].line) * _arm(letter, columns, radius, facts, rows[0].line)
    readings, missing, digits = _read_rows(rows[1:], columns, factor)
    if not readings:
        raise Refusal(rows[0].line, rows[0].cells[columns.value], "no row holds a reading", "Fill in that column")
    scale = float(columns.value_scale) * abs(factor)
    unit = "deg" if letter in ROTARY else "mm"
    common = columns.kind != "indicator"
    return ReadingSet(letter, unit, common, tuple(readings), missing, float(digits) * scale, scale, facts)


def instrument_of(readings: ReadingSet, **given: float | None) -> Instrument:
    """The indicator by what is given, else by the form's ``# resolution = 0.01`` and the like, else by the readings.

    ``resolution``, ``accuracy`` and ``hysteresis`` are in the unit of the form's values, ``misalignment`` in degrees.
    Raises Refusal where a fact of the form is no number.
    """
    facts = {key: _fact(readings, key) if given.get(key) is None else given[key] for key in _INSTRUMENT}
    lengths = {key: value * readings.scale for key in _INSTRUMENT[:3] if (value := facts[key]) is not None}
    angle = facts["misalignment"]
    known = Instrument(**{"resolution": readings.resolution, **lengths})
    return known if angle is None else replace(known, misalignment=angle)


_INSTRUMENT = ("resolution", "accuracy", "hysteresis", "misalignment")


def _fact(readings: ReadingSet, key: str) -> float | None:
    text = readings.facts.get(key)
    try:
        value = None if text is None else float(text.replace(",", "."))
    except ValueError:
        value = -1.0
    if value is not None and not 0 <= value < math.inf:
        raise Refusal(1, f"# {key} = {text}", "not a number of zero or more", "Write the bare number, or leave it out")
    return value


def _facts(text: str) -> dict[str, str]:
    """The ``# key = value`` lines, keys in lower case; what is no such line is a plain comment."""
    facts: dict[str, str] = {}
    for raw in text.splitlines():
        line = raw.strip(_FILLING)
        key, equals, value = line.lstrip("#").partition("=")
        if line.startswith("#") and equals and key.strip().replace(" ", "").isalpha() and value.strip():
            facts[key.strip().lower()] = value.strip()
    return facts


# A spreadsheet that saves the form pads every line to the same number of columns, and may put quotes about it.
_FILLING = ',;" \t'


def _rows(text: str) -> Iterator[_Row]:
    """Rows with their line numbers; comments and empty lines left out."""
    separator = ""
    for line, raw in enumerate(text.splitlines(), 1):
        bare = raw.partition("#")[0].strip()
        if not bare.strip(_FILLING):
            continue
        separator = separator or next((mark for mark in (";", "\t", ",") if mark in bare), ",")
        cells = next(csv.reader([bare], delimiter=separator, skipinitialspace=True))
        yield _Row(line, tuple(cell.strip() for cell in cells), separator)


def _columns(head: _Row) -> _Columns:
    names = [cell.lower().replace(" ", "_") for cell in head.cells]
    places = {key: _only(names, key, head) for key in ("run", "direction")}
    target, target_unit, _ = _measured(names, ("target",), head)
    value, value_unit, kind = _measured(names, KINDS, head)
    return _Columns(
        places["run"], places["direction"], target, value, SCALES[target_unit], SCALES[value_unit], value_unit, kind,
        head.separator,
    )  # fmt: skip


def _only(names: list[str], key: str, head: _Row) -> int:
    if names.count(key) != 1:
        raise Refusal(head.line, ", ".join(names), f"the heading must have one column {key}", _HEADING)
    return names.index(key)


_HEADING = "Write a heading such as run,direction,target_mm,indicator_mm"


def _measured(names: list[str], kinds: tuple[str, ...], head: _Row) -> tuple[int, str, str]:
    """Place, unit and kind of the column of that kind; of several value columns a deviation is preferred."""
    found = [(kind, unit) for kind in sorted(kinds) for unit in SCALES if f"{kind}_{unit}" in names]
    wanted = " or ".join(f"{kind}_mm" for kind in kinds)
    if not found:
        reason = f"the heading must have a column {wanted}; the unit may also be {', '.join(list(SCALES)[1:])}"
        raise Refusal(head.line, ", ".join(names), reason, _HEADING)
    kind, unit = found[0]
    if sum(each == kind for each, _ in found) > 1:
        raise Refusal(head.line, ", ".join(names), f"there are two columns {kind}", "Keep one of them")
    return names.index(f"{kind}_{unit}"), unit, kind


def _axis(text: str, line: int) -> str:
    letter = text.strip().upper()
    if letter not in LETTERS:
        way_out = "Name it by --axis, or by a line # axis = X"
        raise Refusal(line, text or "(no axis)", f"the axis must be one of {' '.join(LETTERS)}", way_out)
    return letter


def _sign(columns: _Columns, facts: Mapping[str, str], line: int) -> float:
    sign = facts.get("sign", "+")
    if sign not in ("+", "-") or (sign == "-" and columns.kind == "position"):
        reason = "the sign is + or -, and positions have none"
        raise Refusal(
            line, f"sign = {sign}", reason, "Write # sign = - where the dial falls as the axis moves towards plus"
        )
    return -1.0 if sign == "-" else 1.0


def _arm(letter: str, columns: _Columns, radius: float | None, facts: Mapping[str, str], line: int) -> float:
    """Factor from the form's unit (mm or degrees) to the axis's: degrees per mm at the arm of a rotary axis."""
    angle = columns.value_unit == "deg"
    if letter not in ROTARY and not angle:
        return 1.0
    if letter not in ROTARY:
        raise Refusal(line, "deg", f"axis {letter} moves in mm", "Give the readings in mm, or name a rotary axis")
    if angle:
        return 1.0
    arm = radius if radius is not None else float(_number(facts.get("radius", "0").removesuffix("mm"), line, False))
    if not 0 < arm < math.inf or columns.kind != "indicator":
        reason = "a rotary axis read in mm needs the indicator's distance from its centre"
        raise Refusal(line, columns.value_unit, reason, "Give --radius 50, in mm, and a column indicator_mm")
    return math.degrees(1.0 / arm)


def _read_rows(rows: list[_Row], columns: _Columns, factor: float) -> tuple[list[Reading], int, Decimal]:
    """The readings, the number of empty ones, and the last digit written."""
    seen: dict[tuple[Decimal, int, int], int] = {}
    readings: list[Reading] = []
    missing, digits = 0, 0
    for row in rows:
        key = _key(row, columns)
        if key in seen:
            reason = f"that run, direction and target stand already on line {seen[key]}"
            raise Refusal(row.line, row.text, reason, "Number the runs 1, 2, 3")
        seen[key] = row.line
        text = row.cell(columns.value)
        if text.lower() in EMPTY:
            missing += 1
            continue
        written = _number(text, row.line, columns.separator != ",")
        digits = min(digits, int(written.as_tuple().exponent))
        readings.append(_reading(written, key, row, columns, factor))
    return readings, missing, Decimal(1).scaleb(digits)


def _key(row: _Row, columns: _Columns) -> tuple[Decimal, int, int]:
    """Target in mm or degrees, run, direction of one row."""
    if len(row.cells) <= max(columns.run, columns.direction, columns.target):
        raise Refusal(row.line, row.text, "the row is too short", "Fill every column of the heading")
    comma = columns.separator != ","
    run = _number(row.cells[columns.run], row.line, comma)
    if run != run.to_integral_value() or run < 1:
        raise Refusal(row.line, row.cells[columns.run], "a run is a whole number from 1", "Number the runs 1, 2, 3")
    target = _number(row.cells[columns.target], row.line, comma) * columns.target_scale
    return target.normalize(), int(run), _direction(row.cells[columns.direction], row.line)


def _direction(text: str, line: int) -> int:
    word = text.lower()
    if word in UP:
        return 1
    if word in DOWN:
        return -1
    raise Refusal(line, text or "(empty)", "no direction", "Write up (towards plus) or down (towards minus)")


def _number(text: str, line: int, comma: bool) -> Decimal:
    """The exact number; a decimal comma counts where a comma does not part the columns."""
    try:
        number = Decimal(text.strip().replace(",", ".") if comma else text.strip())
    except InvalidOperation:
        way_out = "Write a bare number with a point, or leave the cell empty where the reading is missing"
        raise Refusal(line, text or "(empty)", "no number", way_out) from None
    if not number.is_finite() or abs(number) > 10**9:
        raise Refusal(line, text, "out of reach", "Write a number in the unit of the heading")
    return number


def _reading(written: Decimal, key: tuple[Decimal, int, int], row: _Row, columns: _Columns, factor: float) -> Reading:
    target, run, direction = key
    value = written * columns.value_scale
    deviation = float(value - target if columns.kind == "position" else value) * factor
    if abs(deviation) > LARGEST:
        reason = f"that is {abs(deviation):.0f} mm or degrees away from the target {target:f}"
        raise Refusal(row.line, row.cells[columns.value], reason, "Look at the unit and at the name of the column")
    return Reading(float(target), run, direction, deviation, row.line)
