"""Options in which the operator states what a program does not: start position and side, work offsets, tool lengths."""

from __future__ import annotations

import re
from collections.abc import Sequence
from decimal import Decimal, InvalidOperation
from typing import Annotated

import typer

from gcodetool.errors import SheetError
from gcodetool.lash.knowledge import Start
from gcodetool.lash.running import Settings
from gcodetool.machine import LETTERS
from gcodetool.motion.frames import OFFSET_WORDS
from gcodetool.program.numbers import decimal_to_quanta

StartOption = Annotated[
    list[str] | None,
    typer.Option(
        "--start",
        metavar="AXIS=POSITION[SIDE]",
        help="Where an axis stands at the start, mm, and on which side, as x=0- or y=12.5+ or z=+; repeatable.",
    ),
]
OffsetOption = Annotated[
    list[str] | None,
    typer.Option("--offset", metavar="G54:AXIS=MM", help="Value of a work offset, as G54:x=120.5; repeatable."),
]
LengthOption = Annotated[
    list[str] | None,
    typer.Option("--length", metavar="H=MM", help="Length of a tool by H number, as 1=42.3; repeatable."),
]
BlockDeleteOption = Annotated[
    str | None,
    typer.Option(
        "--block-delete", metavar="on|off", help="Position of the block delete switch (on skips blocks with a slash)."
    ),
]
LookAheadOption = Annotated[
    int,
    typer.Option(
        "--look-ahead", metavar="N", min=0, max=10_000, help="Blocks held back at most to make a take-up in air."
    ),
]
ClearZOption = Annotated[
    str | None,
    typer.Option("--clear-z", metavar="MM", help="Program Z above which there is no work: take-ups may go there."),
]
HoleOvershootOption = Annotated[
    str | None,
    typer.Option(
        "--hole-overshoot",
        metavar="MM",
        help="Reach every hole from the datum side, so that its place does not hang on the lash.",
    ),
]

_START = re.compile(r"([A-Za-z])=([-+]?(?:\d+\.?\d*|\.\d+))?([-+])?")
_OFFSET = re.compile(r"([Gg]\d+(?:\.\d)?):([A-Za-z])=([-+]?(?:\d+\.?\d*|\.\d+))")
_LENGTH = re.compile(r"[Hh]?(\d+)=([-+]?(?:\d+\.?\d*|\.\d+))")


def settings_from(
    start: Sequence[str] | None,
    offset: Sequence[str] | None,
    length: Sequence[str] | None,
    block_delete: str | None,
    look_ahead: int,
    hole_overshoot: str | None = None,
    clear_z: str | None = None,
) -> Settings:
    """What the operator states, read; raises SheetError with the way to write it."""
    if block_delete not in (None, "on", "off"):
        raise SheetError(f"--block-delete {block_delete}: write on or off")
    offsets: dict[str, dict[str, int]] = {}
    for text in offset or ():
        word, letter, value = _offset(text)
        offsets.setdefault(word, {})[letter] = value
    return Settings(
        start=dict(_start(text) for text in start or ()),
        offsets=offsets,
        lengths=dict(_length(text) for text in length or ()),
        look_ahead=look_ahead,
        block_delete=None if block_delete is None else block_delete == "on",
        hole_overshoot=_overshoot(hole_overshoot),
        clear_z=None if clear_z is None else _height(clear_z),
    )


def _overshoot(text: str | None) -> int:
    if text is None:
        return 0
    try:
        value = Decimal(text)
    except InvalidOperation:
        raise SheetError(f"--hole-overshoot {text}: write a length in mm, as 0.5") from None
    if not 0 < value <= 20:
        raise SheetError(f"--hole-overshoot {text}: write a length in mm, above 0 and at most 20")
    return decimal_to_quanta(value)


def _height(text: str) -> int:
    try:
        return decimal_to_quanta(Decimal(text))
    except InvalidOperation:
        raise SheetError(f"--clear-z {text}: write a height in mm, as 2.5") from None


def _letter(text: str, option: str) -> str:
    if text.upper() not in LETTERS:
        raise SheetError(f"{option}: {text} is no axis; the axes are {' '.join(LETTERS)}")
    return text.upper()


def _start(text: str) -> tuple[str, Start]:
    found = _START.fullmatch(text.strip())
    if not found or not (found[2] or found[3]):
        raise SheetError(f"--start {text}: write an axis, its position in mm and its side, as x=0- or y=12.5+ or z=+")
    side = {"+": 1, "-": -1, None: 0}[found[3]]
    return _letter(found[1], "--start"), Start(Decimal(found[2]) if found[2] else None, side)


def _offset(text: str) -> tuple[str, str, int]:
    found = _OFFSET.fullmatch(text.strip())
    if not found or found[1].upper() not in OFFSET_WORDS:
        raise SheetError(f"--offset {text}: write a work offset, an axis and mm, as G54:x=120.5")
    return found[1].upper(), _letter(found[2], "--offset"), decimal_to_quanta(Decimal(found[3]))


def _length(text: str) -> tuple[int, int]:
    found = _LENGTH.fullmatch(text.strip())
    if not found:
        raise SheetError(f"--length {text}: write an H number and mm, as 1=42.3")
    return int(found[1]), decimal_to_quanta(Decimal(found[2]))
