"""Records of the cut: the path, where the cutter meets material, labels, forces; no more than properties.

Words of the trade used here:

climb, conventional   material on the right of the feed, on the left (M3, right-hand cutter); slot: on both sides
engagement            the angles of the cutter's circle that meet material: 0 left of the feed, 90 deg ahead, 180 right
radial width          material removed per mm of feed and of depth; for a straight cut the radial depth of cut ae
axial depth           height of the material that the cutter meets, ap
chip load             feed per tooth, fz
held, doubtful,       whether friction and preload keep an axis on its flank against the cut
dragged

Lengths are mm, angles radians unless a name says otherwise, feeds mm/min, forces N, times s.  Positions are those of
the cutter's tip in program coordinates.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from enum import IntEnum

import numpy as np
from numpy.typing import NDArray

from gcodetool.inspection.job_records import SHAPES, Cutter

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Flags = NDArray[np.bool_]


class Label(IntEnum):
    """How a stretch of feed motion cuts."""

    AIR = 0
    CLIMB = 1
    CONVENTIONAL = 2
    SLOT = 3

    @property
    def word(self) -> str:
        """The label as it is written."""
        return self.name.lower()


class Kind(IntEnum):
    """What a feed motion is, beside its label."""

    RAPID = 0
    LEVEL = 1
    RAMP = 2
    HELIX = 3
    RISE = 4
    PLUNGE = 5
    DRILL = 6
    OTHER = 7
    """A motion that is not followed: rotary axes take part."""

    @property
    def word(self) -> str:
        """The kind as it is written."""
        return self.name.lower()


class Hold(IntEnum):
    """Whether an axis stays on its flank; larger is worse, UNKNOWN where friction or force is not known."""

    HELD = 0
    UNKNOWN = 1
    DOUBTFUL = 2
    DRAGGED = 3

    @property
    def word(self) -> str:
        """The verdict as it is written."""
        return self.name.lower()


@dataclass(frozen=True, slots=True)
class Cutters:
    """All tools of a job as columns; a tool is its index here."""

    radius: Floats
    kind: Ints
    tip: Floats
    slope: Floats
    flutes: Floats
    hand: Floats

    @classmethod
    def of(cls, cutters: Sequence[Cutter]) -> Cutters:
        """Columns of these cutters."""
        return cls(
            radius=np.array([cutter.radius for cutter in cutters], float),
            kind=np.array([SHAPES[cutter.shape] for cutter in cutters], np.int64),
            tip=np.array([0.5 * cutter.tip for cutter in cutters], float),
            slope=np.array([np.tan(np.radians(0.5 * cutter.angle)) for cutter in cutters], float),
            flutes=np.array([cutter.flutes for cutter in cutters], float),
            hand=np.array([cutter.hand for cutter in cutters], float),
        )


@dataclass(frozen=True, slots=True)
class Path:
    """All moves of a program as columns; row k is one move.

    ``start`` and ``end`` are (n, 3) positions of the tip.  ``plane`` is 0 for a line, else 1, 2, 3 for an arc in XY,
    ZX, YZ, with ``centre`` (n, 2), ``radius``, ``angle`` (start) and ``sweep`` in that plane.  ``feed`` in mm/min and
    ``speed`` in rpm are nan where never said; ``sense`` is +1 for M3, -1 for M4, 0 while the spindle stands.
    ``tool`` is an index into the cutters of the job.  ``chain`` counts contours: it grows at every rapid and every
    stop.  ``turning`` marks moves of rotary axes, ``unplaced`` those that begin at a place which the program has not
    said.

    ``base`` is the machine position of program zero, known for the axes in ``placed``; the machine position of Z is
    that of the tip plus ``base`` plus ``length_offset``.  ``systems`` are the work offsets in which the program cuts.
    """

    line: Ints
    rapid: Flags
    start: Floats
    end: Floats
    plane: Ints
    centre: Floats
    radius: Floats
    angle: Floats
    sweep: Floats
    length: Floats
    feed: Floats
    speed: Floats
    sense: Ints
    tool: Ints
    length_offset: Floats
    turning: Flags
    unplaced: Flags
    chain: Ints
    base: tuple[float, float, float] = (0.0, 0.0, 0.0)
    placed: str = ""
    systems: tuple[str, ...] = ()

    @property
    def count(self) -> int:
        """Number of moves."""
        return len(self.line)


@dataclass(frozen=True, slots=True)
class Samples:
    """Places along the moves at which the engagement was found; row k is one place.

    ``weight`` is the length of path (3D, mm) that it stands for, ``share`` where on the move it lies (0..1), ``x, y,
    z`` the tip, ``fx, fy`` the feed direction in plan.  ``vertical`` marks places of plunges, which have no
    direction.
    """

    move: Ints
    share: Floats
    weight: Floats
    x: Floats
    y: Floats
    z: Floats
    fx: Floats
    fy: Floats
    vertical: Flags


@dataclass(frozen=True, slots=True)
class Slices:
    """Engaged intervals: a sample meets material from angle ``first`` to ``last`` between ``low`` and ``high``.

    ``radius`` is that of the cutter there.  Sorted by sample.
    """

    sample: Ints
    first: Floats
    last: Floats
    low: Floats
    high: Floats
    radius: Floats


@dataclass(frozen=True, slots=True)
class Engagement:
    """What the cutter meets along the whole program.

    ``touching`` marks samples that remove nothing but rub along a face cut before (a spring pass); ``buried`` is the
    share of the end face of a plunge or ramp that stands on material; ``volume`` in mm^3 is what a plunge removes.
    """

    samples: Samples
    slices: Slices
    touching: Flags
    buried: Floats
    volume: Floats


@dataclass(frozen=True, slots=True)
class Cut:
    """The engagement of each sample as figures; nan where there is none.

    ``left`` and ``right`` are mm^2 of material per mm of feed on either side of the feed direction, ``area`` their
    sum, ``depth`` the axial depth, ``width`` = area / depth the mean radial width, ``first`` and ``last`` the
    outermost angles.
    """

    left: Floats
    right: Floats
    area: Floats
    depth: Floats
    width: Floats
    first: Floats
    last: Floats


@dataclass(frozen=True, slots=True)
class Labels:
    """Labels by sample and by move, and the kind of each move.

    ``flips`` are pairs of moves between which a contour changes, with the label before and after.

    ``label`` of a move is the one that holds on most of its cutting length.  ``spring`` marks moves that only rub.
    """

    by_sample: Ints
    by_move: Ints
    kind: Ints
    spring: Flags
    air_share: Floats
    flips: tuple[tuple[int, int, Label, Label], ...] = ()


@dataclass(frozen=True, slots=True)
class Forces:
    """Mean force on the tool at each sample in program axes, N, and the chip; nan where it cannot be told.

    ``fx, fy, fz`` are the nominal estimate, ``along`` and ``side`` the same in feed direction and to its left.
    """

    fx: Floats
    fy: Floats
    fz: Floats
    along: Floats
    side: Floats
    peak: Floats
    power: Floats
    chip_load: Floats
    mean_chip: Floats
    thinning: Floats


@dataclass(frozen=True, slots=True)
class Holding:
    """The verdict for one axis: by sample ``verdict`` and ``ratio`` = force over threshold, and ``push``.

    ``push`` is +1 or -1 where the cut drags the axis to that end of its lash, 0 where it does not.
    """

    axis: str
    verdict: Ints
    ratio: Floats
    push: Ints
