"""A simple strict RS-274 controller: program bytes and one concrete machine to motion in machine coordinates.

Written from NISTIR 6556 section 3 (order of execution: table 8) and from nothing of the product.  What the language
does not hold raises ``ControllerError``.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

from tests.oracle.arcs import Arc, ArcError, arc_by_centre, arc_by_radius
from tests.oracle.cycles import CODES as CYCLES
from tests.oracle.cycles import Hole, hole_steps
from tests.oracle.machine import (
    AXES,
    FRAME_CODES,
    GROUP_OF,
    INERT_M,
    OFFSETS,
    PLANES,
    PROBES,
    SYSTEMS,
    TAKES_AXES,
    Event,
    Item,
    Machine,
    Motion,
    Point,
)
from tests.oracle.reader import Block, ControllerError, read_blocks


def run(program: bytes, machine: Machine) -> list[Item]:
    """All motion and events of ``program`` on ``machine`` in order; raises ``ControllerError``."""
    controller = _Controller(machine)
    items: list[Item] = []
    for block in read_blocks(program):
        if block.deletable and (block.gcodes or block.words.keys() & set(AXES)):
            items.append(Event("frame", block.line))
        if block.deletable and machine.delete_blocks:
            continue
        try:
            items.extend(controller.execute(block))
        except ArcError as error:
            raise ControllerError(block.line, str(error)) from error
        if controller.ended:
            break
    return items


def _by_group(block: Block) -> dict[str, int]:
    groups: dict[str, int] = {}
    for code in block.gcodes:
        name = GROUP_OF.get(code)
        if name is None:
            raise ControllerError(block.line, f"unknown code G{code / 10:g}")
        if name in groups and {groups[name], code} != {0, 800}:
            raise ControllerError(block.line, f"two codes of the {name} group")
        # G0 and G80 on one line leave G0, in either order
        groups[name] = 0 if groups.get(name) in (0, 800) and name == "motion" else code
    return groups


class _Controller:
    """Modal state and the one step from a block to its items."""

    def __init__(self, machine: Machine) -> None:
        self.machine = machine
        self.position: Point = machine.start
        self.unit = 25.4 if machine.inch else 1.0
        self.motion, self.plane = 10, 170
        self.incremental = False
        self.centre_absolute = False
        self.feed_mode = 940
        self.system = 0
        self.old_level = True
        self.work = [list(point) for point in machine.work]
        self.local = [0.0] * 6
        self.set_offset = [0.0] * 6
        self.set_offset_on = True
        self.length = [0.0] * 6
        self.feed = 0.0
        self.spindle, self.speed, self.coolant = 5, 0.0, frozenset[int]()
        self.tool = self.next_tool = 0
        self.sticky: dict[str, float] = {}
        self.entry_level: float | None = None
        self.holes = self.line = 0
        self.ended = False

    # --- frames -----------------------------------------------------------------------------------------------

    def scale(self, axis: int) -> float:
        """mm per program unit of a linear axis, 1 for a rotary axis."""
        return self.unit if axis < 3 else 1.0

    def offset(self, axis: int) -> float:
        """Machine coordinate of the program's zero."""
        shift = self.set_offset[axis] if self.set_offset_on else 0.0
        return self.work[self.system][axis] + self.local[axis] + shift + self.length[axis]

    def axis_words(self, block: Block) -> dict[int, float]:
        """Axis index to value in mm or degrees, as written."""
        return {i: block.words[a] * self.scale(i) for i, a in enumerate(AXES) if a in block.words}

    def target(self, values: dict[int, float]) -> Point:
        """Machine point that axis words ask for in the present frame and distance mode."""
        end = list(self.position)
        for axis, value in values.items():
            end[axis] = end[axis] + value if self.incremental else value + self.offset(axis)
        return tuple(end)

    # --- one block --------------------------------------------------------------------------------------------

    def execute(self, block: Block) -> Iterator[Item]:
        """Items of one block, in the order of NISTIR 6556 table 8."""
        self.line = block.line
        groups = _by_group(block)
        codes = {m // 10 if m % 10 == 0 else -1 for m in block.mcodes}
        if codes - INERT_M - {0, 1, 2, 6, 30, 60}:
            raise ControllerError(block.line, "M code that this controller does not know")
        self._modes(block, groups, codes)
        if 6 in codes:
            yield from self._tool_change()
        other = groups.get("other", 0)
        if other == 40:
            yield self._dwell(block)
        self._lengths(block, groups)
        self._frame_modes(groups)
        if "system" in groups or "length" in groups or other in FRAME_CODES:
            yield Event("frame", self.line)
        if other in TAKES_AXES or groups.get("length") == 431:
            self._set_motion(groups)
            yield from self._offset_code(block, other)
        else:
            self._clear_set_position(other)
            yield from self._motion(block, groups, other == 530)
        yield from self._stops(codes)

    def _modes(self, block: Block, groups: dict[str, int], codes: set[int]) -> None:
        self.plane = groups.get("plane", self.plane)
        if "units" in groups:
            self.unit = 25.4 if groups["units"] in (200, 700) else 1.0
        self.feed_mode = groups.get("feed_mode", self.feed_mode)
        if "feed_mode" in groups:
            self.feed = 0.0
        if "F" in block.words:
            self.feed = block.words["F"] * (1.0 if self.feed_mode == 930 else self.unit)
        self.speed = block.words.get("S", self.speed)
        self.next_tool = round(block.words.get("T", self.next_tool))
        spindle = codes & {3, 4, 5}
        self.spindle = spindle.pop() if spindle else self.spindle
        self.coolant = frozenset() if 9 in codes else self.coolant | (codes & {7, 8})

    def _frame_modes(self, groups: dict[str, int]) -> None:
        if "system" in groups:
            self.system = SYSTEMS.index(groups["system"])
        if "distance" in groups:
            self.incremental = groups["distance"] == 910
        if "arc_distance" in groups:
            self.centre_absolute = groups["arc_distance"] == 901
        if "return" in groups:
            self.old_level = groups["return"] == 980

    def _lengths(self, block: Block, groups: dict[str, int]) -> None:
        code = groups.get("length")
        if code == 490:
            self.length = [0.0] * 6
        elif code == 430:
            number = round(block.words.get("H", self.tool))
            self.length = [0.0, 0.0, self.machine.lengths.get(number, 0.0), 0.0, 0.0, 0.0]
        elif code == 431:
            values = self.axis_words(block)
            self.length = [values.get(axis, self.length[axis]) for axis in range(6)]

    def _tool_change(self) -> Iterator[Item]:
        self.tool = self.next_tool
        self.spindle = 5
        if self.machine.tool_change:
            end = tuple(self.machine.tool_change.get(i, value) for i, value in enumerate(self.position))
            yield self._move("rapid", end, frozenset(self.machine.tool_change), machine_frame=True)
        yield Event("tool change", self.line, self.tool)

    def _dwell(self, block: Block) -> Event:
        seconds = block.words.get("P", block.words.get("X"))
        if seconds is None or seconds < 0:
            raise ControllerError(self.line, "G4 without a time")
        return Event("dwell", self.line, seconds)

    def _stops(self, codes: set[int]) -> Iterator[Item]:
        if codes & {0, 1, 60}:
            yield Event("stop", self.line)
        if codes & {2, 30}:
            self.ended = True
            yield Event("end", self.line)

    # --- codes that take the axis words ------------------------------------------------------------------------

    def _offset_code(self, block: Block, other: int) -> Iterator[Item]:
        values = self.axis_words(block)
        if other == 100:
            self._set_system(block, values)
        elif other == 520:
            self.local = [values.get(axis, self.local[axis]) for axis in range(6)]
        elif other == 920:
            self._set_position(values)
        elif other in (280, 300):
            yield from self._home(values, self.machine.home28 if other == 280 else self.machine.home30)

    def _set_system(self, block: Block, values: dict[int, float]) -> None:
        kind, number = block.words.get("L"), round(block.words.get("P", 0))
        if kind not in (2, 20) or not 0 <= number <= 9 or "R" in block.words:
            raise ControllerError(self.line, "G10 other than L2 or L20 with P 0 to 9")
        system = self.work[number - 1 if number else self.system]
        for axis, value in values.items():
            shift = self.set_offset[axis] if self.set_offset_on else 0.0
            rest = self.local[axis] + shift + self.length[axis]
            system[axis] = value if kind == 2 else self.position[axis] - rest - value

    def _set_position(self, values: dict[int, float]) -> None:
        if not values:
            raise ControllerError(self.line, "G92 without an axis word")
        if not self.set_offset_on:
            self.set_offset, self.set_offset_on = [0.0] * 6, True
        for axis, value in values.items():
            self.set_offset[axis] += self.position[axis] - self.offset(axis) - value

    def _clear_set_position(self, other: int) -> None:
        if other == 921:
            self.set_offset = [0.0] * 6
        if other in (921, 922):
            self.set_offset_on = False
        elif other == 923:
            self.set_offset_on = True

    def _home(self, values: dict[int, float], home: Point) -> Iterator[Item]:
        """NISTIR 6556 3.5.8: to the programmed point, then home with the named axes; no words: all axes at once."""
        axes = frozenset(values) or frozenset(range(6))
        if values:
            yield self._move("rapid", self.target(values), axes)
        end = tuple(home[i] if i in axes else value for i, value in enumerate(self.position))
        yield self._move("rapid", end, axes, machine_frame=True)

    # --- motion ----------------------------------------------------------------------------------------------

    def _set_motion(self, groups: dict[str, int]) -> None:
        code = groups.get("motion")
        if code is None:
            return
        if code not in CYCLES or code != self.motion:
            self.sticky = {name: value for name, value in self.sticky.items() if name == "R"}
        if code not in CYCLES or self.motion not in CYCLES:
            self.entry_level = None
        self.motion = code

    def _motion(self, block: Block, groups: dict[str, int], machine_frame: bool) -> Iterator[Item]:
        self._set_motion(groups)
        values = self.axis_words(block)
        centre = any(letter in block.words for letter in "IJKR")
        if self.motion in CYCLES:
            asked = bool(values) or "motion" in groups
        else:
            asked = bool(values) or (self.motion in (20, 30) and centre)
        if machine_frame and self.motion not in (0, 10):
            raise ControllerError(self.line, "G53 needs G0 or G1")
        if not asked:
            return
        if self.motion == 800:
            raise ControllerError(self.line, "axis word after G80")
        if self.motion in CYCLES:
            yield from self._cycle(block, values)
        elif self.motion in PROBES:
            yield self._probe(values)
        elif self.motion in (20, 30):
            yield self._arc(block, values)
        elif machine_frame:
            end = tuple(values.get(i, value) for i, value in enumerate(self.position))
            yield self._move("feed" if self.motion else "rapid", end, frozenset(values), machine_frame=True)
        else:
            yield self._move("feed" if self.motion else "rapid", self.target(values), frozenset(values))
        if self.feed_mode == 930 and self.motion in (10, 20, 30) and "F" not in block.words:
            raise ControllerError(self.line, "feed move in G93 without F")

    def _move(
        self, kind: str, end: Point, named: frozenset[int], arc: Arc | None = None, machine_frame: bool = False
    ) -> Motion:
        context = (self.feed, self.feed_mode, self.spindle, self.speed, self.tool, tuple(sorted(self.coolant)))
        minutes = 1 / self.feed if self.feed_mode == 930 and kind == "feed" and self.feed > 0 else 0.0
        if kind == "rapid" or self.feed_mode == 930:
            context = (0.0, *context[1:])
        move = Motion(kind, self.line, self.position, end, named, arc, machine_frame, context=context, minutes=minutes)
        self.position = end
        return move

    def _arc(self, block: Block, values: dict[int, float]) -> Motion:
        p, q, _ = PLANES[self.plane]
        end = self.target(values)
        clockwise = self.motion == 20
        turns = block.words.get("P", 1.0)
        if turns < 1 or turns != round(turns):
            raise ControllerError(self.line, "P of an arc is no whole number of turns")
        given = {OFFSETS.index(a): block.words[a] * self.unit for a in OFFSETS if a in block.words}
        if "R" in block.words:
            if given:
                raise ControllerError(self.line, "arc with both R and a centre")
            radius = block.words["R"] * self.unit
            arc = arc_by_radius((p, q), self.position, end, radius, clockwise, round(turns))
        else:
            arc = arc_by_centre((p, q), self.position, end, self._centre(given, p, q), clockwise, round(turns))
        return self._move("feed", end, frozenset(values), arc)

    def _centre(self, given: dict[int, float], p: int, q: int) -> tuple[float, float]:
        if not given.keys() & {p, q}:
            raise ControllerError(self.line, "arc without a centre or R")
        if any(value for axis, value in given.items() if axis not in (p, q)):
            raise ControllerError(self.line, "arc with a centre word of another plane")
        if not self.centre_absolute:
            return self.position[p] + given.get(p, 0.0), self.position[q] + given.get(q, 0.0)
        if not given.keys() >= {p, q}:
            raise ControllerError(self.line, "absolute centre needs both words")
        return given[p] + self.offset(p), given[q] + self.offset(q)

    def _probe(self, values: dict[int, float]) -> Motion:
        """Straight to the target or to the first place where an axis meets one of its probe places."""
        end = self.target(values)
        share = 1.0
        for axis, places in self.machine.probes.items():
            travel = end[axis] - self.position[axis]
            low, high = self.machine.play.get(axis, (0.0, 0.0))
            for place in places if travel else ():
                part = (place + (high if travel > 0 else low) - self.position[axis]) / travel
                share = min(share, part) if part >= 0 else share
        if share < 1.0:
            end = tuple(a + share * (b - a) for a, b in zip(self.position, end, strict=True))
        return replace(self._move("probe", end, frozenset(values)), touched=share < 1.0)

    # --- cycles ----------------------------------------------------------------------------------------------

    def _cycle(self, block: Block, values: dict[int, float]) -> Iterator[Item]:
        p, q, normal = PLANES[self.plane]
        self._check_cycle(block, values, normal)
        if self.entry_level is None:
            self.entry_level = self.position[normal]
        words = {name: block.words[name] for name in "RQPIJK" if name in block.words}
        self.sticky.update({n: v * (1.0 if n == "P" else self.unit) for n, v in words.items()})
        if normal in values:
            self.sticky["depth"] = values[normal]
        if "depth" not in self.sticky or "R" not in self.sticky:
            raise ControllerError(self.line, "cycle without depth or R")
        retract, bottom = self._levels(normal)
        if retract < bottom:
            raise ControllerError(self.line, "cycle whose R lies below its bottom")
        old = self.entry_level if self.machine.level_at_entry else self.position[normal]
        if self.position[normal] < retract:
            raised = tuple(retract if i == normal else value for i, value in enumerate(self.position))
            yield self._hole_move("rapid", raised, values, normal, self.holes + 1)
        clear = old if self.old_level and old > retract else retract
        repeats = block.words.get("L", 1.0 if self.motion == 870 else block.words.get("K", 1.0))
        if repeats < 1 or repeats != round(repeats):
            raise ControllerError(self.line, "repeats of a cycle must be a whole number above 0")
        plane_words = {axis: values[axis] for axis in (p, q) if axis in values}
        for _ in range(round(repeats)):
            place = {axis: self.target(plane_words)[axis] for axis in plane_words}
            yield from self._hole(Hole(
                self.motion, normal, place, bottom, retract, clear, self.sticky.get("Q"),
                self._back(bottom, normal), self._aside(p, q), self.machine.peck_clearance,
            ), values)  # fmt: skip

    def _check_cycle(self, block: Block, values: dict[int, float], normal: int) -> None:
        if not values or any(axis > 2 for axis in values):
            raise ControllerError(self.line, "cycle without X, Y, Z, or with a rotary axis")
        if self.feed_mode == 930:
            raise ControllerError(self.line, "cycle in G93")
        if self.motion in (730, 830) and block.words.get("Q", self.sticky.get("Q", 0.0)) <= 0:
            raise ControllerError(self.line, "peck cycle without Q above 0")

    def _levels(self, normal: int) -> tuple[float, float]:
        """Machine positions of R and of the bottom: in G91, R counts from here and the depth from R."""
        if self.incremental:
            retract = self.position[normal] + self.sticky["R"]
            return retract, retract + self.sticky["depth"]
        return self.sticky["R"] + self.offset(normal), self.sticky["depth"] + self.offset(normal)

    def _back(self, bottom: float, normal: int) -> float:
        back = self.sticky.get("K", 0.0)
        return bottom + back if self.incremental else back + self.offset(normal)

    def _aside(self, p: int, q: int) -> tuple[tuple[int, float], ...]:
        return tuple((axis, self.sticky.get(OFFSETS[axis], 0.0)) for axis in (p, q))

    def _hole(self, hole: Hole, values: dict[int, float]) -> Iterator[Item]:
        self.holes += 1
        for kind, end in hole_steps(hole, self.position):
            yield self._hole_move(kind, end, values, hole.normal, self.holes)
        if "P" in self.sticky:
            yield Event("dwell", self.line, self.sticky["P"])

    def _hole_move(self, kind: str, end: Point, values: dict[int, float], normal: int, hole: int) -> Motion:
        move = self._move(kind, end, frozenset(values) | {normal})
        return replace(move, hole=hole, normal=normal, code=self.motion)
