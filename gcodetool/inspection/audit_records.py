"""Records of what an audit says: stock as taken, shapes and their sizes, findings, rows of tables.

Lengths are mm, times s, feeds mm/min, forces N.  Nothing here computes more than a property.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from enum import StrEnum

import numpy as np
from numpy.typing import NDArray

from gcodetool.inspection.job_records import Material

Floats = NDArray[np.float64]
Point = tuple[float, float]


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
class StockTaken:
    """The stock as the audit took it; ``said`` tells what was given and what was guessed, in sentences."""

    outline: tuple[Point, ...]
    top: float
    bottom: float | None
    said: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Shape:
    """Something a caliper can measure, as recognised in the path.

    ``kind`` is bore, boss, arc, wall, slot or hole.  ``moves`` are the moves that leave it, in order, from the first to
    the second of ``ends``.  ``centre`` and ``radius``
    are those of the path for round ones.  ``side`` is +1 where the material stands left of the feed, -1 right, 0 both.
    ``normal`` points into the material of a straight wall.  ``chain`` numbers
    its contour.  ``cutter`` is the radius of the cutter there.
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
    chain: int = 0


@dataclass(frozen=True, slots=True)
class Measure:
    """One figure of a feature, mm: as intended, predicted without and with compensation.

    ``low`` and ``high`` are the compensated figure over the uncertainty of the lash and over dragging.  ``counts`` is
    False for a figure that no tolerance is held against, such as the length of a flat.
    """

    name: str
    intended: float
    before: float
    after: float
    low: float
    high: float
    counts: bool = True

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
        return max((abs(each.error_before) for each in self.measures if each.counts), default=0.0)

    @property
    def worst_after(self) -> float:
        """The largest error with compensation, mm."""
        return max((abs(each.error_after) for each in self.measures if each.counts), default=0.0)


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
    """One feed motion: means over its cutting length; angles in degrees, ``removed`` in mm^3, nan for none."""

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
