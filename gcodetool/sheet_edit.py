"""Exchanges single values in the text of a machine sheet; comments, order and every other entry stay as they are.

A sheet has one key per line under ``[axes.<letter>]``.  After each change the text is read again, and the result must
be the old sheet with exactly the change asked for: else the sheet is left alone and a SheetError says why.

The history of an axis is one key with one former value per line::

    history = [
        { measured = 2024-05-31, lash = 0.12, uncertainty = 0.01, method = "indicator" },
    ]
"""

from __future__ import annotations

import datetime
import json
import re
import tomllib
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from typing import Any

from gcodetool.errors import SheetError
from gcodetool.machine import LETTERS

Value = Decimal | int | str | datetime.date | Sequence["FormerLash"]
HISTORY = "history"


@dataclass(frozen=True, slots=True)
class FormerLash:
    """One lash value of an axis, now or once, in mm (degrees for A B C); None where the sheet did not say."""

    lash: Decimal
    uncertainty: Decimal | None = None
    measured: datetime.date | None = None
    method: str | None = None


def write_lash(text: str, axis: str, new: FormerLash) -> str:
    """The sheet with that lash on the axis; the value that stood there moves into the history.

    A first value is no history: neither a table without lash nor a lash of 0 that nobody measured is kept.  The same
    measurement written twice is kept once.  Raises SheetError.
    """
    former = current_lash(text, axis)
    changes: dict[str, Value | None] = {
        "lash": new.lash, "uncertainty": new.uncertainty, "measured": new.measured, "method": new.method,
    }  # fmt: skip
    if former is not None and former != new and (former.measured or former.lash):
        changes[HISTORY] = (*lash_history(text, axis), former)
    return set_values(text, axis, changes)


def current_lash(text: str, axis: str) -> FormerLash | None:
    """The lash the sheet states for an axis; None where it states none."""
    table = _axis_table(_tree(text), axis)
    return _former(table) if "lash" in table else None


def lash_history(text: str, axis: str) -> tuple[FormerLash, ...]:
    """The former values of an axis as the sheet lists them, oldest first; empty where there is none."""
    entries = _axis_table(_tree(text), axis).get(HISTORY, [])
    return tuple(_former(entry) for entry in entries)


def set_values(text: str, axis: str, changes: Mapping[str, Value | None]) -> str:
    """The sheet with those keys of one axis set; a key whose value is None is taken out.

    A key that is there keeps its line and its comment; a new one follows the last key of the table; a missing table is
    added at the end.  Raises SheetError where the text is no TOML, or written in a way that cannot be changed safely.
    """
    before = _tree(text)
    letter = _key_of(before, axis)
    end = "\r\n" if "\r\n" in text else "\n"
    after = text
    for key, value in changes.items():
        # Not splitlines: TOML ends a line at a line feed only.
        lines = re.findall(r"[^\n]*\n|[^\n]+", after)
        after = "".join(_set_key(lines, letter, key, value, end))
    _prove(before, after, letter, changes)
    return after


def _tree(text: str) -> dict[str, Any]:
    try:
        return tomllib.loads(text, parse_float=Decimal)
    except (ValueError, ArithmeticError, RecursionError) as fault:
        raise SheetError(f"the machine sheet is not TOML: {fault}. Mend it first; it was left as it was.") from None


def _key_of(tree: Mapping[str, Any], axis: str) -> str:
    """The axis letter as this sheet spells it, small where it has no such table yet."""
    if axis.upper() not in LETTERS:
        raise SheetError(f"axis {axis!r}: the axes are {' '.join(LETTERS)}.")
    axes = tree.get("axes", {})
    return next((key for key in axes if key.upper() == axis.upper()), axis.lower()) if isinstance(axes, dict) else axis


def _axis_table(tree: Mapping[str, Any], axis: str) -> Mapping[str, Any]:
    axes = tree.get("axes", {})
    table = axes.get(_key_of(tree, axis), {}) if isinstance(axes, dict) else {}
    return table if isinstance(table, dict) else {}


def _former(table: Any) -> FormerLash:
    if not isinstance(table, dict) or not isinstance(table.get("lash"), int | Decimal):
        raise SheetError(f"the entry {table!r} of a sheet has no lash; write lash = 0.12 there, or take the entry out.")
    uncertainty = table.get("uncertainty")
    return FormerLash(
        Decimal(table["lash"]),
        None if uncertainty is None else Decimal(uncertainty),
        table.get("measured"),
        table.get("method"),
    )


def _prove(before: dict[str, Any], after: str, letter: str, changes: Mapping[str, Value | None]) -> None:
    """The changed text must read as the old sheet with those keys changed, and nothing else."""
    axes = before.setdefault("axes", {})
    wanted = axes.setdefault(letter, {}) if isinstance(axes, dict) else {}
    for key, value in changes.items():
        wanted.pop(key, None)
        if value is not None:
            wanted[key] = tomllib.loads(f"x = {spell(value)}", parse_float=Decimal)["x"]
    try:
        same = tomllib.loads(after, parse_float=Decimal) == before
    except (ValueError, ArithmeticError):
        same = False
    if not same:
        raise SheetError(
            f"axis {letter}: the sheet is written in a way that cannot be changed safely, and was left as it was. "
            f"Write [axes.{letter}] on a line of its own and one key per line below it."
        )


def spell(value: Value) -> str:
    """A value as TOML; a history spans several lines."""
    if isinstance(value, str):
        if not value.isprintable():
            raise SheetError(f"{value!r} cannot stand in a sheet: write plain text on one line.")
        # A JSON string of printable text is a TOML basic string.
        return json.dumps(value, ensure_ascii=False)
    if isinstance(value, datetime.date):
        return value.isoformat()
    if isinstance(value, Decimal | int):
        return f"{value:f}" if isinstance(value, Decimal) else str(value)
    rows = [f"    {{ {_spell_entry(entry)} }},\n" for entry in value]
    return "[\n" + "".join(rows) + "]"


def _spell_entry(entry: FormerLash) -> str:
    order = ("measured", "lash", "uncertainty", "method")
    pairs = [(key, getattr(entry, key)) for key in order]
    return ", ".join(f"{key} = {spell(value)}" for key, value in pairs if value is not None)


_TABLE = re.compile(r"\s*\[(?!\[)\s*([^\[\]]+?)\s*\]\s*(#.*)?$")
_ANY_TABLE = re.compile(r"\s*\[")
_KEY = re.compile(r"\s*([A-Za-z0-9_-]+|\"[^\"]*\"|'[^']*')\s*=\s*")
_OFF = re.compile(r"\s*#\s*([A-Za-z_]+)\s*=")


def _set_key(lines: list[str], letter: str, key: str, value: Value | None, end: str) -> list[str]:
    """The lines with one key of that axis's table set, added or taken out."""
    table = _find_table(lines, letter)
    if table is None:
        return lines if value is None else _append_table(lines, letter, f"{key} = {spell(value)}", end)
    entries = _entries(lines, *table)
    first, last = next((place for name, place in entries if name == key), (0, 0))
    if value is None:
        return lines[:first] + lines[last:]
    if not last:
        return _insert(lines, _place_for(lines, table, entries), f"{key} = {spell(value)}", end)
    return [*lines[:first], _exchange(lines[first:last], spell(value), end), *lines[last:]]


def _find_table(lines: Sequence[str], letter: str) -> tuple[int, int] | None:
    """First line behind the table's heading, and the line of the next heading or the end."""
    start = None
    for number, line in enumerate(lines):
        if start is not None and _ANY_TABLE.match(line) and not _inside_value(lines, start, number):
            return start, number
        named = _TABLE.match(line)
        if start is None and named and named[1].replace(" ", "").replace('"', "") == f"axes.{letter}":
            start = number + 1
    return None if start is None else (start, len(lines))


def _inside_value(lines: Sequence[str], start: int, number: int) -> bool:
    """True where line ``number`` belongs to a value of several lines that began behind ``start``."""
    return any(first < number < last for _, (first, last) in _entries(lines, start, len(lines)))


def _entries(lines: Sequence[str], start: int, stop: int) -> list[tuple[str, tuple[int, int]]]:
    """Keys with their lines (first, one past the last); a value may run over several lines."""
    entries: list[tuple[str, tuple[int, int]]] = []
    number = start
    while number < stop:
        named = _KEY.match(lines[number])
        if not named:
            number += 1
            continue
        last = _value_end(lines, number, named.end())
        entries.append((named[1].strip("\"'"), (number, last)))
        number = last
    return entries


def _value_end(lines: Sequence[str], first: int, column: int) -> int:
    """One past the last line of the value: the shortest run of lines that is a whole TOML value."""
    text = lines[first][column:]
    for last in range(first + 1, len(lines) + 1):
        try:
            tomllib.loads("x = " + text)
        except ValueError:
            text += lines[last] if last < len(lines) else ""
            continue
        return last
    return first + 1


def _place_for(lines: Sequence[str], table: tuple[int, int], entries: Iterable[tuple[str, tuple[int, int]]]) -> int:
    """Behind the last key of the table and the switched-off keys that follow it, else right under the heading."""
    where = max((last for _, (_, last) in entries), default=table[0])
    while where < table[1] and _OFF.match(lines[where]):
        where += 1
    return where


def _insert(lines: Sequence[str], where: int, text: str, end: str) -> list[str]:
    before = list(lines[:where])
    if before and not before[-1].endswith("\n"):
        before[-1] += end
    return [*before, text.replace("\n", end) + end, *lines[where:]]


def _append_table(lines: Sequence[str], letter: str, text: str, end: str) -> list[str]:
    apart = "\n" if lines and lines[-1].strip() else ""
    return _insert(lines, len(lines), f"{apart}[axes.{letter}]\n{text}", end)


def _exchange(old: Sequence[str], value: str, end: str) -> str:
    """The lines of one entry with another value; what stands before it and its comment stay."""
    text = "".join(old)
    named = _KEY.match(text)
    head = named[0] if named else ""
    line_end = text[len(text.rstrip("\r\n")) :]
    comment = _comment(text[len(head) :].rstrip("\r\n"))
    return head + value.replace("\n", end) + comment + line_end


def _comment(text: str) -> str:
    """The comment behind a value, with the white space before it: the longest end that TOML reads as nothing."""
    try:
        whole = tomllib.loads("x = " + text, parse_float=Decimal)
    except ValueError:
        return ""
    for place, mark in enumerate(text):
        if mark == "#":
            start = len(text[:place].rstrip(" \t"))
            try:
                if tomllib.loads("x = " + text[:start], parse_float=Decimal) == whole:
                    return text[start:]
            except ValueError:
                continue
    return ""
