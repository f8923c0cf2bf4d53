"""Run a program on the product's controller and look at what it does in plain mm; for the tests in this folder."""

from __future__ import annotations

from typing import NamedTuple

from gcodetool.errors import Refusal
from gcodetool.motion.command import Command, read_block
from gcodetool.motion.controller import Controller
from gcodetool.motion.modal import ModalState
from gcodetool.motion.moves import ORDER, Event, Move, Setup
from gcodetool.program.blocks import blocks_of
from gcodetool.program.numbers import QUANTA_PER_MM

Point = tuple[float, ...]


class Step(NamedTuple):
    """A move in mm: rapid or feed, where it ends (X Y Z), its source line."""

    rapid: bool
    end: Point
    line: int


def quanta(mm: float) -> int:
    """mm to quanta."""
    return round(mm * QUANTA_PER_MM)


def place(**mm: float) -> dict[str, int]:
    """Positions by axis letter."""
    return {letter: quanta(value) for letter, value in mm.items()}


def items(program: str | bytes, setup: Setup | None = None) -> list[Move | Event]:
    """All moves and events; mm unless the setup says otherwise."""
    data = program.encode("latin-1") if isinstance(program, str) else program
    return list(Controller(setup or Setup(units="mm")).run(blocks_of(data)))


def moves(program: str | bytes, setup: Setup | None = None) -> list[Move]:
    """The moves alone."""
    return [item for item in items(program, setup) if isinstance(item, Move)]


def mm(position: tuple[int, ...], axes: str = "XYZ") -> Point:
    """A position of quanta in mm, to a millionth."""
    return tuple(round(position[ORDER.index(letter)] / QUANTA_PER_MM, 6) for letter in axes)


def steps(program: str, setup: Setup | None = None, axes: str = "XYZ") -> list[Step]:
    """The moves that move something, in mm."""
    return [Step(m.rapid, mm(m.end, axes), m.line) for m in moves(program, setup) if m.start != m.end or m.arc]


def ends(program: str, setup: Setup | None = None, axes: str = "XYZ") -> list[Point]:
    """Where each of these moves ends."""
    return [step.end for step in steps(program, setup, axes)]


def command_of(text: str, state: ModalState | None = None) -> Command:
    """One block read in a modal state (mm, G1 by default)."""
    (block,) = blocks_of(text.encode("latin-1"))
    return read_block(block, state or ModalState(motion="G1", units="G21"))


def refusal_of(program: str, setup: Setup | None = None) -> Refusal:
    """The refusal that a program must end in."""
    try:
        found = items(program, setup)
    except Refusal as refusal:
        return refusal
    raise AssertionError(f"not refused: {found}")
