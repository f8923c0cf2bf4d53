"""Records of what a controller does: moves in machine coordinates, and events between them.

A position is a tuple of six integers in quanta (1e-10 mm or degree) in the order X Y Z A B C.  Programs are written
as if the tool moved over a fixed part (ISO 841), so ``+`` is the tool's direction.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import NamedTuple

from gcodetool.motion.arcs import Arc

Position = tuple[int, int, int, int, int, int]
ORDER = "XYZABC"


class Context(NamedTuple):
    """What holds during a move beside its path: feed as written with its mode, spindle, tool; None where never said.

    ``feed`` is in mm/min (degrees/min on rotary axes alone), in 1/min for ``feed_mode`` G93, in mm per turn for G95.
    ``spindle`` is M3, M4 or M5.
    """

    feed: float | None = None
    feed_mode: str = "G94"
    speed: float | None = None
    spindle: str = ""
    tool: str | None = None


class Move(NamedTuple):
    """One motion: ``rapid`` or feed, source line, both ends, the arc in machine coordinates (mm) for an arc.

    ``axes`` are the indexes of the first and second plane axis of the arc.  ``unplaced`` are the letters whose start
    is not known from the program, so that their direction is not either.  ``hole`` is what a move is to the hole of a
    cycle: "in", "out", "peck", "back", or "" where it is none of them (see ``cycles``).
    ``named`` are the letters of the axes that the block has words of.
    """

    rapid: bool
    line: int
    start: Position
    end: Position
    arc: Arc | None
    axes: tuple[int, int]
    context: Context
    unplaced: str = ""
    hole: str = ""
    named: str = ""


class Event(NamedTuple):
    """Something that can move the sides: "tool change", "home", "probe" or "stop"; ``letters`` are its axes."""

    what: str
    line: int
    at: Position
    letters: str = ""


@dataclass(frozen=True, slots=True)
class Setup:
    """A concrete machine to run a program on; quanta by axis letter, 0 where nothing is said.

    ``offsets`` by work offset word, ``lengths`` by H number, ``homes`` by G28 and G30, ``tool_change`` the place M6
    goes to (None: it does not move), ``contacts`` where each probe in turn stops (axis letter to machine position;
    the middle of its travel where none is given).  ``unplaced`` are the letters whose start position is not known.
    """

    start: Mapping[str, int] = field(default_factory=dict)
    offsets: Mapping[str, Mapping[str, int]] = field(default_factory=dict)
    lengths: Mapping[int, int] = field(default_factory=dict)
    homes: Mapping[str, Mapping[str, int]] = field(default_factory=dict)
    tool_change: Mapping[str, int] | None = None
    contacts: Sequence[Mapping[str, int]] = ()
    units: str | None = None
    skip_deletable: bool = False
    unplaced: str = ""
