"""Records of the audit.  Nothing here computes more than a property.

Words of the trade used here:

climb, conventional   material on the right of the feed, on the left (spindle M3, right-hand cutter); slot: on both sides
engagement            the angles of the cutter's circle that meet material; 0 left of the feed, 90 deg ahead, 180 deg right
radial width          material removed per mm of feed and mm of depth; for a straight cut the radial depth of cut ae
axial depth           height of the material that the cutter meets, ap
chip load             feed per tooth, fz
held, doubtful, dragged   whether friction and preload keep an axis on its flank against the cut

Lengths are mm, angles radians unless a name says otherwise, feeds mm/min, forces N, times s.  Positions are those of the
cutter's tip in machine coordinates, which are the program's own where no work offset is given.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from enum import IntEnum, StrEnum

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Flags = NDArray[np.bool_]
Point = tuple[float, float]

FLAT, BALL, VEE = range(3)
SHAPES = {"flat": FLAT, "ball": BALL, "vee": VEE, "drill": VEE}


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


class Severity(StrEnum):
    """How much a finding matters."""

    NOTE = "note"
    CAUTION = "caution"
    DANGER = "danger"

    @property
    def rank(self) -> int:
        """Larger is worse."""
        return list(Severity).index(self)


@dataclass(frozen=True, slots=True)
class Cutter:
    """One tool.  ``shape`` is flat, ball, vee or drill; ``angle`` the included angle of a vee or drill in degrees.

    ``tip`` is the flat at the tip of a vee, mm across.  ``hand`` is +1 for a right-hand cutter.  ``most_speed`` is the speed
    marked on it, rpm.
    """

    number: str
    diameter: float
    flutes: int = 2
    shape: str = "flat"
    angle: float = 90.0
    tip: float = 0.0
    hand: int = 1
    most_speed: float | None = None

    @property
    def radius(self) -> float:
        """Half the diameter, mm."""
        return 0.5 * self.diameter


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
class StockShape:
    """The stock in plan as an outline (mm), with its top and its bottom; None where nobody said."""

    outline: tuple[Point, ...] | None = None
    top: float | None = None
    bottom: float | None = None


@dataclass(frozen=True, slots=True)
class KeepOut:
    """A clamp or a screw: an outline in plan, and the height up to which it stands."""

    name: str
    outline: tuple[Point, ...]
    top: float


@dataclass(frozen=True, slots=True)
class Material:
    """Cutting data of a material.

    ``kt``, ``kr``, ``ka`` are cutting coefficients in N/mm^2, ``et``, ``er``, ``ea`` edge coefficients in N/mm (tangential,
    radial, axial).  Where ``kt`` is None the specific force is ``kc11 * h**-mc`` (Kienzle), and ``kr``, ``ka`` are its
    radial and axial shares, without unit.
    ``low`` and ``high`` are the factors of the stated band.  ``least_chip`` is the chip below which the edge rubs, ``most_chip``
    the chip load not to be passed on a light machine; mm.
    """

    name: str
    source: str
    kc11: float | None = None
    mc: float = 0.25
    kt: float | None = None
    kr: float = 0.3
    ka: float = 0.0
    et: float = 0.0
    er: float = 0.0
    ea: float = 0.0
    low: float = 0.5
    high: float = 2.0
    least_chip: float = 0.005
    most_chip: float | None = None


@dataclass(frozen=True, slots=True)
class Job:
    """What the machine is to cut: stock, tools, clamps, material, and what the program does not say.

    ``speed`` in rpm and ``feed`` in mm/min count where the program states none.  ``zero`` is the machine position of program
    zero by axis letter, None where it is not known.  ``tolerance`` is the size error that is worth a finding, mm.
    """

    cutters: tuple[Cutter, ...] = ()
    stock: StockShape = StockShape()
    keep_outs: tuple[KeepOut, ...] = ()
    material: Material | None = None
    speed: float | None = None
    feed: float | None = None
    least_speed: float | None = None
    most_speed: float | None = None
    zero: Mapping[str, float] | None = None
    tolerance: float = 0.05


@dataclass(frozen=True, slots=True)
class Path:
    """All moves of a program as columns; row k is one move.

    ``start`` and ``end`` are (n, 3) positions of the tip.  ``plane`` is 0 for a line, else 1, 2, 3 for an arc in XY, ZX, YZ, with
    ``centre`` (n, 2), ``radius``, ``angle`` (start) and ``sweep`` in that plane.  ``feed`` in mm/min and ``speed`` in rpm are nan
    where never said; ``sense`` is +1 for M3, -1 for M4, 0 while the spindle stands.  ``tool`` is an index into ``cutters``.
    ``length_offset`` is added to Z to get the machine position.  ``chain`` counts contours: it grows at every rapid.  ``turning``
    marks moves of rotary axes.  ``stops`` are the (line, word) of tool changes, homings, probes and stops before each move.
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
    events: tuple[tuple[int, int, str], ...]
    tool_words: tuple[str, ...] = ()

    @property
    def count(self) -> int:
        """Number of moves."""
        return len(self.line)


@dataclass(frozen=True, slots=True)
class StockTaken:
    """The stock as the audit took it; ``said`` tells what was given and what was guessed, in sentences."""

    outline: tuple[Point, ...]
    top: float
    bottom: float | None
    said: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Samples:
    """Places along the moves at which the engagement was found; row k is one place.

    ``weight`` is the length of path (3D, mm) that it stands for, ``share`` where on the move it lies (0..1), ``x, y, z`` the
    tip, ``fx, fy`` the feed direction in plan.  ``vertical`` marks places of plunges, which have no direction.
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
    """Engaged intervals: in each, a sample meets material from angle ``first`` to ``last`` between ``low`` and ``high``.

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

    ``touching`` marks samples that remove nothing but rub along a face cut before (a spring pass); ``buried`` is the share of
    the end face of a plunge or ramp that stands on material; ``volume`` in mm^3 is what a plunge removes.
    """

    samples: Samples
    slices: Slices
    touching: Flags
    buried: Floats
    volume: Floats


@dataclass(frozen=True, slots=True)
class Cut:
    """The engagement of each sample as figures; nan where there is none.

    ``left`` and ``right`` are mm^2 of material per mm of feed on either side of the feed direction, ``area`` their sum,
    ``depth`` the axial depth, ``width`` = area / depth the mean radial width, ``first`` and ``last`` the outermost angles.
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
    """Labels by sample and by move, and the kind of each move; ``flips`` are pairs of moves between which a contour changes.

    ``label`` of a move is the one that holds on most of its cutting length.  ``spring`` marks moves that only rub.
    """

    by_sample: Ints
    by_move: Ints
    kind: Ints
    spring: Flags
    air_share: Floats
    flips: tuple[tuple[int, int], ...] = ()


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


@dataclass(frozen=True, slots=True)
class Shape:
    """Something a caliper can measure, as recognised in the path.

    ``kind`` is bore, boss, arc, wall, slot or hole.  ``moves`` are the moves that leave it, in order, from the first to
    the second of ``ends``.  ``centre`` and ``radius``
    are those of the path for round ones.  ``side`` is +1 where the material stands left of the feed, -1 right, 0 both.
    ``normal`` points into the material of a straight wall.  ``cutter`` is the radius of the cutter there.
    """

    kind: str
    moves: tuple[int, ...]
    lines: tuple[int, int]
    ends: tuple[Point, Point]
    cutter: float
    depth: float
    centre: Point = (0.0, 0.0)
    radius: float = 0.0
    side: int = 0
    normal: Point = (0.0, 0.0)


@dataclass(frozen=True, slots=True)
class Measure:
    """One figure of a feature, mm: as intended, predicted without and with compensation.

    ``low`` and ``high`` are the compensated figure over the uncertainty of the lash and over dragging.
    """

    name: str
    intended: float
    before: float
    after: float
    low: float
    high: float

    @property
    def error_before(self) -> float:
        """Predicted minus intended without compensation."""
        return self.before - self.intended

    @property
    def error_after(self) -> float:
        """The larger of the possible errors with compensation."""
        return max(self.low - self.intended, self.high - self.intended, key=abs)


@dataclass(frozen=True, slots=True)
class Feature:
    """Something a caliper can measure: ``kind`` bore, boss, arc, wall, slot, width or hole pair; where; which lines."""

    kind: str
    name: str
    lines: tuple[int, int]
    at: Point
    depth: float
    measures: tuple[Measure, ...]
    dragged: str = ""

    @property
    def worst(self) -> float:
        """The largest error without compensation, mm, for sorting."""
        return max((abs(each.error_before) for each in self.measures), default=0.0)

    @property
    def worst_after(self) -> float:
        """The largest error with compensation, mm."""
        return max((abs(each.error_after) for each in self.measures), default=0.0)


@dataclass(frozen=True, slots=True)
class Finding:
    """One thing the user must know: stable ``code``, where (line 0: the whole program), what and what to do."""

    code: int
    severity: Severity
    line: int
    text: str
    action: str
    count: int = 1


@dataclass(frozen=True, slots=True)
class Durations:
    """Time of the job in s: moves at their feeds, and from stop to stop where accelerations are known (else None)."""

    feed: float
    rapid: float
    stop_to_stop: float | None
    take_ups: int
    take_up_time: float
    by_move: Floats
    said: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class ShareRow:
    """Length (mm) and time (s) of one label for one tool."""

    tool: str
    label: str
    length: float
    time: float
    share_of_length: float
    share_of_time: float


@dataclass(frozen=True, slots=True)
class AxisRow:
    """What the cut does to one axis: length of feed path by verdict, worst place."""

    axis: str
    held: float
    unknown: float
    doubtful: float
    dragged: float
    worst_ratio: float
    worst_line: int
    threshold: str


@dataclass(frozen=True, slots=True)
class AxisEnvelope:
    """Lowest and highest commanded position of an axis, take-ups and settles included."""

    axis: str
    low: float
    high: float
    travel: tuple[float, float] | None
    placed: bool


@dataclass(frozen=True, slots=True)
class MoveRow:
    """One feed motion in figures: means over its cutting length; angles in degrees, ``removed`` in mm^3, nan for none."""

    line: int
    kind: str
    label: str
    spring: bool
    length: float
    first_angle: float
    last_angle: float
    width: float
    depth: float
    removed: float
    chip_load: float
    mean_chip: float
    along: float
    side: float
    force: tuple[float, float, float]
    holds: Mapping[str, str] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Audit:
    """Everything an audit found; ``assumptions`` belong into every output."""

    program: str
    moves: int
    feed_moves: int
    stock: StockTaken
    tools: tuple[str, ...]
    material: Material | None
    rows: tuple[MoveRow, ...]
    shares: tuple[ShareRow, ...]
    flips: tuple[tuple[int, int, str, str], ...]
    axes: tuple[AxisRow, ...]
    features: tuple[Feature, ...]
    envelope: tuple[AxisEnvelope, ...]
    durations: Durations
    findings: tuple[Finding, ...]
    assumptions: tuple[str, ...]
    cautions: tuple[str, ...]
