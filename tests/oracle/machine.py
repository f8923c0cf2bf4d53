"""What the controller is given and what it gives back: a concrete machine, moves, events; and the table of G codes.

Positions are six numbers X Y Z A B C in machine coordinates, mm and degrees.  Codes are ten times the number written.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from tests.oracle.arcs import Arc
from tests.oracle.cycles import CODES as CYCLES

AXES = "XYZABC"
PLANES = {170: (0, 1, 2), 180: (2, 0, 1), 190: (1, 2, 0)}
OFFSETS = "IJK"
PROBES = frozenset({382, 383, 384, 385})
SYSTEMS = (540, 550, 560, 570, 580, 590, 591, 592, 593)
GROUPS: tuple[tuple[str, frozenset[int]], ...] = (
    ("motion", frozenset({0, 10, 20, 30, 800}) | CYCLES | PROBES),
    ("plane", frozenset(PLANES)),
    ("distance", frozenset({900, 910})),
    ("arc_distance", frozenset({901, 911})),
    ("feed_mode", frozenset({930, 940, 950})),
    ("units", frozenset({200, 210, 700, 710})),
    ("cutter", frozenset({400})),
    ("length", frozenset({430, 431, 490})),
    ("return", frozenset({980, 990})),
    ("system", frozenset(SYSTEMS)),
    ("path", frozenset({610, 611, 640})),
    ("spindle_mode", frozenset({970})),
    ("other", frozenset({40, 100, 280, 300, 520, 530, 920, 921, 922, 923})),
)
GROUP_OF = {code: name for name, codes in GROUPS for code in codes}
FRAME_CODES = frozenset({100, 520, 920, 921, 922, 923})
TAKES_AXES = frozenset({40, 100, 280, 300, 520, 920})
INERT_M = frozenset({3, 4, 5, 7, 8, 9, 48, 49})

Point = tuple[float, ...]


def _zero() -> Point:
    return (0.0,) * 6


@dataclass(frozen=True, slots=True)
class Machine:
    """Everything that the program does not say; positions are machine coordinates, mm and degrees.

    ``work`` holds the nine work offsets, ``lengths`` tool length by H number (a missing H has length 0), ``probes`` the
    places on an axis where the probe changes state (of the true tool, not the command), ``play`` the interval
    (low, high) of command less actual per axis (needed only to know at which command the probe trips), ``tool_change``
    where M6 takes the axes (empty: M6 moves nothing), ``level_at_entry`` whether G98 returns to the level at the first
    line of a cycle (True) or of each line (False, NISTIR 6556).
    """

    start: Point = field(default_factory=_zero)
    work: tuple[Point, ...] = field(default_factory=lambda: (_zero(),) * 9)
    lengths: dict[int, float] = field(default_factory=dict)
    home28: Point = field(default_factory=_zero)
    home30: Point = field(default_factory=_zero)
    inch: bool = False
    delete_blocks: bool = False
    probes: dict[int, tuple[float, ...]] = field(default_factory=dict)
    play: dict[int, tuple[float, float]] = field(default_factory=dict)
    tool_change: dict[int, float] = field(default_factory=dict)
    level_at_entry: bool = False
    peck_clearance: float = 0.254


@dataclass(frozen=True, slots=True)
class Motion:
    """One commanded move.

    ``kind`` is rapid, feed or probe; ``named`` the indexes of the axes that the block commands; ``machine_frame`` is
    true for G53, the home leg of G28 and G30, and a tool changer; ``hole`` numbers the repetitions of cycles from 1 (0:
    no cycle) and ``normal`` is then the drilling axis; ``context`` is the state that metal feels: feed, feed mode,
    spindle, speed, tool, coolant; ``minutes`` is the time asked for by G93, else 0; ``touched``: a
    probe move stopped before its target.
    """

    kind: str
    line: int
    start: Point
    end: Point
    named: frozenset[int]
    arc: Arc | None = None
    machine_frame: bool = False
    hole: int = 0
    normal: int = 2
    code: int = 0
    context: tuple[object, ...] = ()
    minutes: float = 0.0
    touched: bool = False


@dataclass(frozen=True, slots=True)
class Event:
    """Something between moves: ``what`` is tool change (side lost), frame, dwell, stop or end.

    ``value`` is the tool or the seconds; a frame event says that a reader of the program may no longer know the
    position (work offset, tool length, set position, a deletable block).
    """

    what: str
    line: int
    value: float = 0.0


Item = Motion | Event
