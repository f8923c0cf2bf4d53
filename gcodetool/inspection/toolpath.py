"""A program as columns of moves of the cutter's tip, for the audit; and the moves as short pieces."""

from __future__ import annotations

import math
from array import array
from collections.abc import Iterable, Sequence

import numpy as np

from gcodetool.errors import SheetError
from gcodetool.inspection.cutting_records import Flags, Floats, Ints, Path
from gcodetool.inspection.job_records import Cutter, Job
from gcodetool.inspection.swept import A0, COLUMNS, CX, CY, RC, SWEEP, TOOL, X0, X1, Y0, Y1, Z0, Z1
from gcodetool.motion.controller import Controller
from gcodetool.motion.moves import Event, Move, Setup
from gcodetool.program.blocks import Block
from gcodetool.program.numbers import QUANTA_PER_MM

SENSE = {"M3": 1, "M4": -1}
PLANES = {(0, 1): 1, (2, 0): 2, (1, 2): 3}
PLANE_PAIRS = ((0, 1), (0, 1), (2, 0), (1, 2))
# an arc outside XY is a straight line in plan; cut into chords of this angle, which leaves 0.2 % of its radius in Z
CHORD = math.radians(7.5)
# a piece of an arc in XY turns at most this far, so that it cannot meet itself
SEXTANT = math.pi / 3.0
_FINE = 1e-9
# columns of a row while a program is read, and the one that marks moves from an unknown place
WIDE, UNPLACED = 23, 21


def read_path(blocks: Iterable[Block], job: Job, setup: Setup) -> Path:
    """All moves of a program; ``setup`` says what the program does not: units, work offsets, tool lengths.

    Positions count from the program zero of the first cut, so that stock and clamps have the program's coordinates.
    Every axis counts as standing at program zero, at an unknown place, before the program says otherwise.  Raises
    Refusal, and SheetError where a feed motion uses a tool that the job does not know.
    """
    controller = Controller(setup)
    rows = array("d")
    tools: dict[str, int] = {}
    systems: list[str] = []
    chain, base = 0, (0.0, 0.0, 0.0)
    for happening in controller.run(blocks):
        if isinstance(happening, Event):
            chain += 1
            if happening.what == "home" and not setup.offsets and rows and rows[-WIDE] == happening.line:
                rows[UNPLACED - WIDE] = 1.0  # a machine position, which has no place among those of the program
            continue
        if happening.start == happening.end and happening.arc is None:
            continue
        chain += happening.rapid
        if not happening.rapid and controller.frames.active not in systems:
            systems.append(controller.frames.active)
            base = base if len(systems) > 1 else _base(setup, systems[0])
        unknown = bool(controller.unplaced) and any(letter in controller.unplaced for letter in "XYZ")
        length = controller.frames.length / QUANTA_PER_MM
        rows.extend(_row(happening, _tool(happening, job.cutters, tools), length, unknown, chain, job))
    placed = "".join(sorted(setup.offsets.get(systems[0], {}))) if systems else ""
    return _columns(rows, base, placed, tuple(systems))


def _base(setup: Setup, system: str) -> tuple[float, float, float]:
    """Machine position of the zero of a work offset, mm."""
    offset = setup.offsets.get(system, {})
    x, y, z = (offset.get(letter, 0) / QUANTA_PER_MM for letter in "XYZ")
    return x, y, z


def _tool(move: Move, cutters: Sequence[Cutter], seen: dict[str, int]) -> int:
    """The index of the cutter of a move.  Raises SheetError for a feed motion whose cutter nobody described."""
    word = move.context.tool or "0"
    found = seen.get(word)
    if found is not None and (found >= 0 or move.rapid):
        return max(found, 0)
    numbers = [cutter.number for cutter in cutters]
    if word in numbers:
        found = numbers.index(word)
    elif "*" in numbers:
        found = numbers.index("*")
    elif move.rapid:
        found = -1
    else:
        name = f"tool T{word}" if move.context.tool else "the tool, to which the program gives no T word"
        key = word if move.context.tool else "any"
        raise SheetError(
            f"line {move.line}: nothing is known of {name}: state its diameter in mm, as --tool {key}=3.175, "
            "or in the job sheet"
        )
    seen[word] = found
    return max(found, 0)


def _row(move: Move, tool: int, offset: float, unknown: bool, chain: int, job: Job) -> tuple[float, ...]:
    start = [value / QUANTA_PER_MM for value in move.start]
    end = [value / QUANTA_PER_MM for value in move.end]
    turning = any(move.start[k] != move.end[k] for k in (3, 4, 5))
    arc = move.arc
    length = math.dist(start[:3], end[:3])
    plane, shape = 0, (0.0, 0.0, 0.0, 0.0, 0.0)
    if arc is not None:
        plane = PLANES[move.axes]
        radius = 0.5 * (arc.start_radius + arc.end_radius)
        rest = next(k for k in range(3) if k not in move.axes)
        length = math.hypot(radius * arc.sweep, end[rest] - start[rest])
        shape = (arc.centre[0], arc.centre[1], radius, arc.start_angle, arc.sweep)
        if plane != 1:
            shape = _lowered(shape, move.axes, offset)
    speed = move.context.speed if move.context.speed else job.speed
    return (
        move.line, move.rapid, *start[:2], start[2] - offset, *end[:2], end[2] - offset, plane, *shape, length,
        _feed(move, length, speed, job), math.nan if speed is None else speed,
        SENSE.get(move.context.spindle, 0), tool, offset, turning, unknown, chain,
    )  # fmt: skip


def _lowered(
    shape: tuple[float, ...], axes: tuple[int, int], offset: float
) -> tuple[float, float, float, float, float]:
    """The centre of an arc in a plane with Z, measured to the tip."""
    first, second = (shape[k] - (offset if axes[k] == 2 else 0.0) for k in (0, 1))
    return first, second, shape[2], shape[3], shape[4]


def _feed(move: Move, length: float, speed: float | None, job: Job) -> float:
    """Feed in mm/min; nan where it is not known."""
    if move.rapid:
        return math.nan
    feed = move.context.feed
    if not feed:
        return math.nan if job.feed is None else job.feed
    if move.context.feed_mode == "G93":
        return feed * length
    if move.context.feed_mode == "G95":
        return math.nan if speed is None else feed * speed
    return feed


def _columns(rows: array[float], base: tuple[float, float, float], placed: str, systems: tuple[str, ...]) -> Path:
    table = np.frombuffer(rows, np.float64).reshape(-1, WIDE)
    whole = table[:, [0, 8, 17, 18]].astype(np.int64)
    plane, centre = whole[:, 1], table[:, 9:11].copy()
    for number, pair in enumerate(PLANE_PAIRS):
        if number:
            centre[plane == number] -= [base[pair[0]], base[pair[1]]]
    return Path(
        line=whole[:, 0], rapid=table[:, 1] > 0.0, start=table[:, 2:5] - base, end=table[:, 5:8] - base,
        plane=plane, centre=centre, radius=table[:, 11].copy(), angle=table[:, 12].copy(),
        sweep=table[:, 13].copy(), length=table[:, 14].copy(), feed=table[:, 15].copy(), speed=table[:, 16].copy(),
        sense=whole[:, 2], tool=whole[:, 3], length_offset=table[:, 19].copy(), turning=table[:, 20] > 0.0,
        unplaced=table[:, 21] > 0.0, chain=table[:, 22].astype(np.int64), base=base, placed=placed, systems=systems,
    )  # fmt: skip


def cut_up(path: Path, chosen: Ints, longest: Floats, steepest: Floats) -> tuple[Floats, Ints, Floats, Floats]:
    """Moves as pieces in order of time: ``(pieces, move, first share, last share)``.

    ``longest`` is the length in plan, ``steepest`` the fall in Z that one piece of each chosen move may have.
    """
    plan = plan_length(path, chosen)
    fall = np.abs(path.end[chosen, 2] - path.start[chosen, 2])
    tall = (path.plane[chosen] > 1) * np.abs(path.sweep[chosen]) / CHORD
    wide = (path.plane[chosen] == 1) * np.abs(path.sweep[chosen]) / SEXTANT
    count = np.ceil(np.maximum.reduce([plan / longest, fall / steepest, tall, wide, np.ones(len(chosen))]) - _FINE)
    row = np.repeat(np.arange(len(chosen)), count.astype(np.int64))
    index = np.arange(len(row)) - (np.cumsum(count) - count)[row]
    low, high = index / count[row], (index + 1.0) / count[row]
    move = chosen[row]
    pieces = np.zeros((len(row), COLUMNS))
    pieces[:, [X0, Y0, Z0]], pieces[:, [X1, Y1, Z1]] = places(path, move, low), places(path, move, high)
    arc = np.flatnonzero(path.plane[move] == 1)
    which = move[arc]
    pieces[arc, CX], pieces[arc, CY], pieces[arc, RC] = path.centre[which, 0], path.centre[which, 1], path.radius[which]
    pieces[arc, A0] = path.angle[which] + path.sweep[which] * low[arc]
    pieces[arc, SWEEP] = path.sweep[which] * (high - low)[arc]
    pieces[:, TOOL] = path.tool[move]
    return pieces, move, low, high


def plan_length(path: Path, chosen: Ints) -> Floats:
    """Lengths of moves in plan."""
    straight = np.hypot(*(path.end[chosen, :2] - path.start[chosen, :2]).T)
    round_about = np.abs(path.radius[chosen] * path.sweep[chosen])
    return np.where(path.plane[chosen] > 0, round_about, straight)


def places(path: Path, move: Ints, share: Floats) -> Floats:
    """Positions (n, 3) of the tip at shares of moves."""
    start, end = path.start[move], path.end[move]
    found = start + (end - start) * share[:, None]
    for plane in (1, 2, 3):
        rows = np.flatnonzero((path.plane[move] == plane) & (share > 0.0) & (share < 1.0))
        which, pair = move[rows], PLANE_PAIRS[plane]
        angle = path.angle[which] + path.sweep[which] * share[rows]
        found[rows, pair[0]] = path.centre[which, 0] + path.radius[which] * np.cos(angle)
        found[rows, pair[1]] = path.centre[which, 1] + path.radius[which] * np.sin(angle)
    return found


def directions(path: Path, move: Ints, share: Floats) -> tuple[Floats, Floats, Flags]:
    """Unit feed directions in plan and the places that have none (vertical motion)."""
    step = path.end[move, :2] - path.start[move, :2]
    for plane in (1, 2, 3):
        rows = np.flatnonzero(path.plane[move] == plane)
        which, pair = move[rows], PLANE_PAIRS[plane]
        angle = path.angle[which] + path.sweep[which] * share[rows]
        turn = np.sign(path.sweep[which])
        slope = np.zeros((len(rows), 3))
        slope[:, pair[0]], slope[:, pair[1]] = -np.sin(angle) * turn, np.cos(angle) * turn
        if plane == 1:
            step[rows] = slope[:, :2]
        else:
            rest = 3 - pair[0] - pair[1]
            along = path.end[which, rest] - path.start[which, rest]
            slope[:, rest] = along / np.maximum(np.abs(path.radius[which] * path.sweep[which]), _FINE)
            step[rows] = slope[:, :2]
    size = np.hypot(step[:, 0], step[:, 1])
    vertical = size < 1e-6
    safe = np.where(vertical, 1.0, size)
    return np.where(vertical, 1.0, step[:, 0] / safe), np.where(vertical, 0.0, step[:, 1] / safe), vertical


def vertical_moves(path: Path) -> Flags:
    """Straight moves along Z alone."""
    still = np.all(np.abs(path.end[:, :2] - path.start[:, :2]) < _FINE, axis=1)
    found: Flags = still & (path.plane == 0) & (np.abs(path.end[:, 2] - path.start[:, 2]) > _FINE)
    return found
