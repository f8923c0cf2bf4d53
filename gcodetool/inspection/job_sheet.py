"""The job sheet: stock, tools, clamps and material of one job, read from TOML or from options.

It loads neither numpy nor shapely.  Lengths are mm, speeds rpm, feeds mm/min, positions in program coordinates,
whatever units the program uses.
"""

from __future__ import annotations

import difflib
import math
import tomllib
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import fields, replace
from typing import Any

from gcodetool.errors import SheetError
from gcodetool.inspection.job_records import SHAPES, Cutter, Job, KeepOut, Material, Outline, StockShape
from gcodetool.inspection.materials import material_named
from gcodetool.inspection.outlines import outline_of

DRILL_ANGLE = 118.0
HANDS = {"right": 1, "left": -1}
_JOB_NUMBERS = ("speed", "feed", "least_speed", "most_speed", "tolerance")
_TOOL_KEYS = ("diameter", "flutes", "shape", "angle", "tip", "hand", "most_speed")
_OUTLINES = ("box", "disc", "polygon")
_MATERIAL_KEYS = tuple(field.name for field in fields(Material))


class _Wrong(Exception):
    """One thing wrong with one value, in words."""


def parse_job(text: str, label: str = "job sheet") -> Job:
    """The job of a sheet's text.  Raises SheetError that names every fault, one per line, each behind the label."""
    try:
        tree = tomllib.loads(text)
    except (ValueError, RecursionError) as fault:
        raise SheetError(
            f'{label}: not TOML: {fault}. Text stands in quotes (shape = "ball"), numbers do not.'
        ) from None
    faults: list[str] = []
    job = _read(tree, faults)
    if faults:
        raise SheetError("\n".join(f"{label}: {fault}" for fault in faults))
    return job


def _read(tree: Mapping[str, Any], faults: list[str]) -> Job:
    _unknown(tree, ("job", "stock", "tools", "keep_out", "material"), "table", faults)
    table = _table(tree, "job", faults)
    _unknown(table, (*_JOB_NUMBERS, "material"), "key", faults, "job.")
    values: dict[str, Any] = {
        key: _take(table, key, _above_zero, "job", faults) for key in _JOB_NUMBERS if key in table
    }
    material = _material(tree, table, faults)
    tools = _table(tree, "tools", faults)
    cutters = [_cutter(number, each, faults) for number, each in tools.items()]
    clamps = _table(tree, "keep_out", faults)
    keep_outs = [_keep_out(name, each, faults) for name, each in clamps.items()]
    return Job(
        cutters=tuple(each for each in cutters if each is not None),
        stock=_stock(_table(tree, "stock", faults), faults),
        keep_outs=tuple(each for each in keep_outs if each is not None),
        material=material,
        **{key: value for key, value in values.items() if value is not None},
    )


def _table(tree: Mapping[str, Any], key: str, faults: list[str]) -> Mapping[str, Any]:
    table = tree.get(key, {})
    if isinstance(table, dict):
        return table
    faults.append(f"{key}: must be a table; write [{key}] on a line of its own and the keys below it.")
    return {}


def _unknown(table: Mapping[str, Any], known: Sequence[str], kind: str, faults: list[str], place: str = "") -> None:
    for key in table:
        if key not in known:
            near = difflib.get_close_matches(key.lower(), known, 1, 0.5)
            guess = f"did you mean {near[0]}?" if near else f"the {kind}s are {', '.join(known)}."
            faults.append(f"{place}{key}: unknown {kind}; {guess}")


def _take(table: Mapping[str, Any], key: str, read: Callable[[Any], Any], place: str, faults: list[str]) -> Any:
    """The value of a key; None where it is missing or wrong, which is then told."""
    if key not in table:
        return None
    try:
        return read(table[key])
    except _Wrong as fault:
        faults.append(f"{place}.{key}: {fault}.")
        return None


def _number(value: Any) -> float:
    if isinstance(value, bool) or not isinstance(value, int | float) or not math.isfinite(value):
        raise _Wrong("must be a bare number, such as 3.175")
    return float(value)


def _above_zero(value: Any) -> float:
    number = _number(value)
    if number <= 0.0:
        raise _Wrong("must be more than 0")
    return number


def _zero_or_more(value: Any) -> float:
    number = _number(value)
    if number < 0.0:
        raise _Wrong("must be 0 or more")
    return number


def _text(value: Any) -> str:
    if not isinstance(value, str) or not value.isprintable():
        raise _Wrong("must be text in quotes, on one line")
    return value


# ---- tools -----------------------------------------------------------------------------------------------------------


def _cutter(number: str, table: Any, faults: list[str]) -> Cutter | None:
    place = f"tools.{number}"
    if not isinstance(table, dict):
        faults.append(f"{place}: must be a table with a diameter.")
        return None
    _unknown(table, _TOOL_KEYS, "key", faults, f"{place}.")
    try:
        return cutter(number, table)
    except _Wrong as fault:
        faults.append(f"{place}: {fault}.")
        return None


def cutter(number: str, values: Mapping[str, Any]) -> Cutter:
    """One tool from its values; raises an error that the callers here turn into a SheetError."""
    if "diameter" not in values:
        raise _Wrong("the diameter is missing")
    shape = _one_of(values.get("shape", "flat"), tuple(SHAPES), "shape")
    hand = HANDS[_one_of(values.get("hand", "right"), tuple(HANDS), "hand")]
    flutes = _above_zero(values.get("flutes", 2))
    if flutes != int(flutes):
        raise _Wrong("flutes must be a whole number")
    angle = _above_zero(values.get("angle", DRILL_ANGLE if shape == "drill" else 90.0))
    if angle >= 180.0:
        raise _Wrong("angle is the included angle of the tip in degrees, below 180")
    name = "*" if number in ("*", "any") else number.lstrip("tT").lstrip("0") or "0"
    most = _above_zero(values["most_speed"]) if "most_speed" in values else None
    tip = _zero_or_more(values.get("tip", 0.0))
    return Cutter(name, _above_zero(values["diameter"]), int(flutes), shape, angle, tip, hand, most)


def _one_of(value: Any, known: Sequence[str], key: str) -> str:
    if value not in known:
        raise _Wrong(f"{key} must be one of {', '.join(known)}")
    return str(value)


def cutter_from_option(text: str) -> Cutter:
    """A tool from ``1=3.175`` or ``1=6,ball,flutes=1,hand=left``; ``*=3`` is every other one.  Raises SheetError."""
    number, _, rest = text.partition("=")
    words = [word.strip() for word in rest.split(",")]
    values: dict[str, Any] = {}
    try:
        if not number.strip() or not words[0]:
            raise _Wrong("write the tool's number, = and its diameter: --tool 1=3.175")
        values["diameter"] = _parsed(words[0])
        for word in words[1:]:
            key, mark, value = word.partition("=")
            if not mark and word in SHAPES:
                values["shape"] = word
            elif mark and key in _TOOL_KEYS:
                values[key] = value if key in ("shape", "hand") else _parsed(value)
            else:
                raise _Wrong(f"{word}: write one of {', '.join(SHAPES)}, or key=value with {', '.join(_TOOL_KEYS)}")
        return cutter(number.strip(), values)
    except _Wrong as fault:
        raise SheetError(f"--tool {text}: {fault}") from None


def _parsed(text: str) -> float:
    try:
        return float(text)
    except ValueError:
        raise _Wrong(f"{text} is no number; lengths are bare numbers in mm") from None


# ---- stock, clamps, material ----------------------------------------------------------------------------------------


def _stock(table: Mapping[str, Any], faults: list[str]) -> StockShape:
    _unknown(table, (*_OUTLINES, "top", "bottom"), "key", faults, "stock.")
    top, bottom = (_take(table, key, _number, "stock", faults) for key in ("top", "bottom"))
    if top is not None and bottom is not None and bottom >= top:
        faults.append("stock: the bottom must lie below the top.")
    return StockShape(_outline(table, "stock", faults), top, bottom)


def _outline(table: Mapping[str, Any], place: str, faults: list[str]) -> Outline | None:
    given = [key for key in _OUTLINES if key in table]
    if len(given) > 1:
        faults.append(f"{place}: {' and '.join(given)}: give one outline.")
    if not given:
        return None
    value = table[given[0]]
    try:
        flat = [number for point in value for number in point] if given[0] == "polygon" else list(value)
        return outline_of(given[0], [_number(number) for number in flat])
    except (TypeError, ValueError, _Wrong) as fault:
        faults.append(f"{place}.{given[0]}: {fault}.")
        return None


def _keep_out(name: str, table: Any, faults: list[str]) -> KeepOut | None:
    place = f"keep_out.{name}"
    if not isinstance(table, dict):
        faults.append(f"{place}: must be a table with an outline and a top.")
        return None
    _unknown(table, (*_OUTLINES, "top"), "key", faults, f"{place}.")
    outline, top = _outline(table, place, faults), _take(table, "top", _number, place, faults)
    if outline is None or top is None:
        faults.append(f"{place}: needs box, disc or polygon, and top.")
        return None
    return KeepOut(name, outline, top)


def _material(tree: Mapping[str, Any], job: Mapping[str, Any], faults: list[str]) -> Material | None:
    if "material" in tree:
        return _own_material(_table(tree, "material", faults), faults)
    name = _take(job, "material", _text, "job", faults)
    try:
        return None if name is None else material_named(name)
    except SheetError as fault:
        faults.append(f"job.material: {fault}")
        return None


def _own_material(table: Mapping[str, Any], faults: list[str]) -> Material | None:
    _unknown(table, _MATERIAL_KEYS, "key", faults, "material.")
    values: dict[str, Any] = {"name": "own material", "source": "the job sheet"}
    for key in _MATERIAL_KEYS:
        value = _take(table, key, _text if key in ("name", "source") else _zero_or_more, "material", faults)
        if value is not None:
            values[key] = value
    if values.get("kt") is None and values.get("kc11") is None:
        faults.append("material: give kt (N/mm^2) or kc11 with mc (Kienzle).")
        return None
    if values.get("kt") is not None and "kr" not in values:
        faults.append("material: kt needs kr, the radial coefficient in N/mm^2.")
    return Material(**values)


def outline_from_option(option: str, text: str) -> Outline:
    """An outline from ``box:x0,y0,x1,y1``, ``disc:x,y,diameter`` or ``polygon:x,y,x,y,x,y``.  Raises SheetError."""
    kind, _, numbers = text.partition(":")
    try:
        if kind not in _OUTLINES:
            raise _Wrong("write box:x0,y0,x1,y1 or disc:x,y,diameter or polygon:x,y,x,y,x,y")
        return outline_of(kind, [_parsed(number) for number in numbers.split(",")])
    except (_Wrong, ValueError) as fault:
        raise SheetError(f"{option} {text}: {fault}") from None


def keep_out_from_option(text: str) -> KeepOut:
    """A keep-out area from an outline, ``@`` and its height: ``box:0,0,20,10@12``.  Raises SheetError."""
    outline, mark, top = text.rpartition("@")
    try:
        if not mark:
            raise _Wrong("write the outline, @ and the height: box:0,0,20,10@12")
        height = _parsed(top)
    except _Wrong as fault:
        raise SheetError(f"--keep-out {text}: {fault}") from None
    return KeepOut(text, outline_from_option("--keep-out", outline), height)


def job_from_options(
    sheet: Job | None = None, *, tools: Iterable[str] = (), stock: str | None = None, top: float | None = None,
    bottom: float | None = None, keep_outs: Iterable[str] = (), material: str | None = None,
    **numbers: float | None,
) -> Job:  # fmt: skip
    """A job from options laid over a sheet: what is given replaces the sheet's value.  Raises SheetError."""
    job = sheet or Job()
    cutters = {each.number: each for each in job.cutters}
    cutters.update((each.number, each) for each in map(cutter_from_option, tools))
    changes: dict[str, Any] = {"cutters": tuple(cutters.values())}
    shape = job.stock
    if stock is not None:
        shape = replace(shape, outline=outline_from_option("--stock", stock))
    shape = replace(shape, top=shape.top if top is None else top, bottom=shape.bottom if bottom is None else bottom)
    if shape.top is not None and shape.bottom is not None and shape.bottom >= shape.top:
        raise SheetError("--stock-bottom: the bottom must lie below the top")
    changes["stock"] = shape
    changes["keep_outs"] = (*job.keep_outs, *map(keep_out_from_option, keep_outs))
    if material is not None:
        changes["material"] = material_named(material)
    for key, value in numbers.items():
        if value is not None and not (math.isfinite(value) and value > 0.0):
            raise SheetError(f"--{key.replace('_', '-')} {value}: must be more than 0")
    changes.update((key, value) for key, value in numbers.items() if value is not None)
    return replace(job, **changes)
