"""The machine sheet: lash, datum side and limits of every axis, read from TOML or from options.

Words of the trade used here:

lash    travel of the drive at a reversal that does not move the table; mm, or degrees for A B C
datum   the side on which the operator set zero: there command and actual position agree
ripple  an excursion up to this size is not counted as a reversal; mm or degrees

Every length in a sheet is in mm (degrees for A B C), whatever units the programs use, and is kept as the exact decimal
that was written.  A sheet has one key per line under ``[machine]`` or ``[axes.<letter>]``, and nothing else, so that a
single value can be exchanged in the text while the comments around it stay.  The history of an axis, its former lash
values, is checked here and read elsewhere.
"""

from __future__ import annotations

import datetime
import difflib
import tomllib
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace
from decimal import Decimal
from pathlib import Path
from typing import Any, Literal

from gcodetool.errors import SheetError
from gcodetool.sheet_keys import AXIS_KEYS, MACHINE_KEYS, ROTARY_KEYS, Reader, WrongValue, from_text, shown

Units = Literal["mm", "in"]
LETTERS = ("X", "Y", "Z", "A", "B", "C")
ROTARY = ("A", "B", "C")


@dataclass(frozen=True, slots=True)
class Axis:
    """One axis of the machine; lengths in mm, or degrees where ``rotary``.

    ``datum`` and ``stiff_side`` are +1 or -1.  ``ripple`` None means the output resolution.  ``travel`` is (low, high)
    in machine coordinates.  ``max_feed`` is in mm/min, ``acceleration`` in mm/s^2 (degrees where rotary), ``preload``
    and ``friction`` in newtons; ``stiff_side`` is the side on which the nut does not give way.
    """

    letter: str
    lash: Decimal = Decimal(0)
    datum: int = -1
    ripple: Decimal | None = None
    travel: tuple[Decimal, Decimal] | None = None
    acceleration: Decimal | None = None
    max_feed: Decimal | None = None
    uncertainty: Decimal | None = None
    measured: datetime.date | None = None
    method: str | None = None
    preload: Decimal | None = None
    friction: Decimal | None = None
    stiff_side: int | None = None

    def __post_init__(self) -> None:
        """Hold what every reader of an axis relies on; raises SheetError."""
        if self.letter not in LETTERS:
            raise SheetError(f"axis {self.letter!r}: the axes are {' '.join(LETTERS)}.")
        if not self.lash.is_finite() or self.lash < 0:
            raise SheetError(f"axis {self.letter}: lash {self.lash} is not zero or more.")
        if self.datum not in (-1, 1):
            raise SheetError(f"axis {self.letter}: datum {self.datum} is neither +1 nor -1.")

    @property
    def rotary(self) -> bool:
        """True for A B C, whose numbers are degrees and are never scaled by inch or mm."""
        return self.letter in ROTARY


@dataclass(frozen=True, slots=True)
class Machine:
    """What the rewriter and the checks need to know about one machine.

    ``units`` is what the controller wakes up in, for programs that state none; None when nobody said.  ``decimals`` is
    the number of decimals of a shifted word in mm or degrees (inch: one more).  ``take_up_feed`` is in mm/min, None for
    the program's own feed.  ``settle_margin`` in mm is added to the lash.
    """

    name: str = ""
    units: Units | None = None
    axes: Mapping[str, Axis] = field(default_factory=dict)
    decimals: int = 4
    take_up_feed: Decimal | None = None
    settle_margin: Decimal = Decimal("0.5")

    def axis(self, letter: str) -> Axis:
        """The axis of that upper-case letter; one without lash where the sheet names none."""
        return self.axes.get(letter) or Axis(letter)

    def places(self, units: Units, letter: str = "X") -> int:
        """Decimals of a shifted word of that axis in a program in these units."""
        return self.decimals + (units == "in" and letter not in ROTARY)


def read_sheet(path: str | Path) -> Machine:
    """The machine of a sheet file (UTF-8 TOML).  Raises SheetError, one fault per line, and OSError."""
    return parse_sheet(decode_sheet(Path(path).read_bytes()), str(path))


def decode_sheet(data: bytes) -> str:
    """The text of a sheet file; a byte order mark is dropped.  Raises SheetError where it is not UTF-8."""
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as fault:
        line = data.count(b"\n", 0, fault.start) + 1
        raise SheetError(f"line {line} is not UTF-8 text; save the sheet as UTF-8.") from None


def parse_sheet(text: str, label: str = "machine sheet") -> Machine:
    """The machine of a sheet's text.  Raises SheetError that names every fault, one per line, each behind the label."""
    machine, faults = _parse(text)
    if faults:
        raise SheetError("\n".join(f"{label}: {fault}" for fault in faults))
    return machine


def check_sheet(text: str) -> list[str]:
    """Every fault of a sheet's text as a plain sentence with its cure; empty where the sheet is good."""
    return _parse(text)[1]


def _parse(text: str) -> tuple[Machine, list[str]]:
    try:
        tree = tomllib.loads(text, parse_float=Decimal)
    except (ValueError, ArithmeticError, RecursionError) as fault:
        return Machine(), [f'not TOML: {fault}. Text stands in quotes (datum = "+"), numbers do not (lash = 0.12).']
    faults = [_unknown(key, ("machine", "axes"), "table") for key in tree if key not in ("machine", "axes")]
    values = _read_table(tree.get("machine", {}), MACHINE_KEYS, "machine", faults)
    axes = _read_axes(tree.get("axes", {}), faults)
    return Machine(**values, axes=axes), faults


def _read_axes(tables: Any, faults: list[str]) -> dict[str, Axis]:
    if not isinstance(tables, dict) or not tables:
        faults.append("there is no axis: write a table [axes.x] with lash = 0.12 for each axis that has lash.")
        return {}
    axes: dict[str, Axis] = {}
    for key, table in tables.items():
        letter = key.upper()
        if letter not in LETTERS:
            faults.append(f"axes.{key}: no such axis; the axes are {' '.join(LETTERS)}, each a table such as [axes.x].")
        elif letter in axes:
            faults.append(f"axes.{key}: axis {letter} stands twice; keep one table.")
        else:
            values = _read_table(table, _keys_of(letter), f"axes.{key}", faults)
            values.pop("history", None)
            axes[letter] = Axis(letter, **values)
    return axes


def _keys_of(letter: str) -> Mapping[str, Reader]:
    return ROTARY_KEYS if letter in ROTARY else AXIS_KEYS


def _read_table(table: Any, keys: Mapping[str, Reader], place: str, faults: list[str]) -> dict[str, Any]:
    """The good values of one table; every bad one is named in ``faults``."""
    if not isinstance(table, dict):
        faults.append(f"{place}: must be a table; write [{place}] on a line of its own and the keys below it.")
        return {}
    values: dict[str, Any] = {}
    for key, value in table.items():
        if key not in keys:
            faults.append(f"{place}: {_unknown(key, keys, 'key')}")
            continue
        try:
            values[key] = keys[key](value)
        except WrongValue as fault:
            faults.append(f"{place}.{key}: {shown(value)} {fault}.")
    return values


def _unknown(key: str, known: Iterable[str], kind: str) -> str:
    near = difflib.get_close_matches(key.lower(), list(known), 1, 0.5)
    return f"unknown {kind} {key}; " + (f"did you mean {near[0]}?" if near else f"the {kind}s are {', '.join(known)}.")


def machine_from_options(
    *,
    sheet: Machine | None = None,
    lash: Iterable[str] = (),
    datum: Iterable[str] = (),
    ripple: Iterable[str] = (),
    units: str | None = None,
    decimals: int | None = None,
    take_up_feed: str | None = None,
    settle_margin: str | None = None,
) -> Machine:
    """A machine from command-line options; what is given replaces the sheet's value, the rest stays.

    ``lash``, ``datum`` and ``ripple`` hold texts such as ``x=0.12`` and ``x=+``; an axis named nowhere has no lash.
    Raises SheetError that names every fault, one per line.
    """
    machine = sheet or Machine()
    faults: list[str] = []
    axes = dict(machine.axes)
    for key, texts in (("lash", lash), ("datum", datum), ("ripple", ripple)):
        for letter, value in _pairs(key, texts, faults).items():
            axes[letter] = replace(axes.get(letter) or Axis(letter), **{key: value})
    given = {"units": units, "decimals": decimals, "take_up_feed": take_up_feed, "settle_margin": settle_margin}
    changes: dict[str, Any] = {}
    for key, value in given.items():
        try:
            if value is not None:
                changes[key] = _read_option(MACHINE_KEYS, key, value)
        except WrongValue as fault:
            faults.append(f"--{key.replace('_', '-')} {value}: the value {fault}.")
    if faults:
        raise SheetError("\n".join(faults))
    return replace(machine, axes=axes, **changes)


def _pairs(key: str, texts: Iterable[str], faults: list[str]) -> dict[str, Any]:
    """Options such as ``x=0.12`` as letter -> value."""
    pairs: dict[str, Any] = {}
    example = "x=+" if key == "datum" else "x=0.12"
    for text in texts:
        name, _, value = text.partition("=")
        letter, option = name.strip().upper(), f"--{key} {text}"
        if not value or letter not in LETTERS:
            faults.append(f"{option}: write one of the axes {' '.join(LETTERS)}, = and the value: --{key} {example}")
            continue
        if letter in pairs:
            faults.append(f"{option}: axis {letter} is given twice; give it once.")
        try:
            pairs[letter] = _read_option(_keys_of(letter), key, value.strip())
        except WrongValue as fault:
            faults.append(f"{option}: the value {fault}.")
    return pairs


def _read_option(keys: Mapping[str, Reader], key: str, value: Any) -> Any:
    return keys[key](value if key in ("datum", "units", "decimals") else from_text(value))


def sheet_template() -> str:
    """A commented sheet to start from; it is a good sheet of a machine without lash."""
    return _TEMPLATE


_TEMPLATE = """\
# Machine sheet. Lengths are mm (degrees for a b c), whatever units the programs use. A line behind # is switched off.

[machine]
name = "my mill"
# units = "mm"           # what the controller wakes up in, for programs without G20 or G21: "mm" or "in"
# decimals = 4           # decimals of a changed word in mm, 4 to 8 (inch gets one more)
# take_up_feed = 300     # mm/min for take-up moves; without it the program's own feed
# settle_margin = 0.5    # mm past the target, on top of the lash, where the side of an axis is not known

# One table for each axis that has lash: x y z a b c.
[axes.x]
lash = 0.0               # travel lost at a reversal: push the table each way against an indicator to see it
datum = "-"              # side in contact when zero was set: "-" after moving in minus, "+" after moving in plus
# ripple = 0.002         # an excursion up to this size is passed without a take-up
# travel = [-300, 0]     # lowest and highest machine position
# max_feed = 3000        # mm/min
# acceleration = 200     # mm/s^2
# uncertainty = 0.005    # of the lash, mm
# measured = 2024-05-31  # when
# method = "indicator, 5 targets, both directions"
# friction = 80          # N, holds the axis against the cut
# preload = 0            # N, of a spring-loaded nut
# stiff_side = "+"       # the side on which that nut does not give way

[axes.y]
lash = 0.0
datum = "-"

[axes.z]
lash = 0.0
datum = "-"
"""
