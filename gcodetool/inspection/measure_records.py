"""Records of measuring the lash: programs to be run, readings taken, figures evaluated.  Nothing here computes.

Words of the trade used here:

target          a position at which the indicator is read
approach        the direction of the motion that ends at a target: +1 (up, towards plus) or -1 (down, towards minus)
run             one series of approaches to all targets, numbered from 1
deviation       actual position minus target; an axis with lash stops short, so up lies below down
reversal value  mean deviation up minus mean deviation down at one target; negative where there is lash
overrun         travel past a target before the motion turns, so that the lash is crossed far away from the reading

Lengths are mm, or degrees for A B C; programs are held in exact decimals, readings in floats.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from decimal import Decimal

from gcodetool.sheet_edit import FormerLash

Words = tuple[tuple[str, Decimal], ...]


@dataclass(frozen=True, slots=True)
class Note:
    """A comment on a line of its own."""

    text: str


@dataclass(frozen=True, slots=True)
class Move:
    """A straight move to the positions in ``words`` (letter, mm or degrees); ``feed`` in mm/min, None for a rapid."""

    words: Words
    feed: Decimal | None = None


@dataclass(frozen=True, slots=True)
class Pause:
    """A message to the operator, then a stop until the start button, or a dwell where ``seconds`` is given."""

    message: str
    seconds: Decimal | None = None


@dataclass(frozen=True, slots=True)
class Spindle:
    """Starts the spindle clockwise at ``rpm``; None stops it."""

    rpm: Decimal | None = None


Step = Note | Move | Pause | Spindle


@dataclass(frozen=True, slots=True)
class ProgramPlan:
    """A program in mm, before it is text: the lines of its head and its steps in order."""

    title: str
    head: tuple[str, ...]
    steps: tuple[Step, ...]


@dataclass(frozen=True, slots=True)
class Visit:
    """One reading asked for: approach ``direction`` to ``target`` (number ``index`` from 1) in ``run`` from 1."""

    index: int
    target: Decimal
    run: int
    direction: int


@dataclass(frozen=True, slots=True)
class Reading:
    """One reading: ``deviation`` in mm or degrees, and the line of the file it stands on."""

    target: float
    run: int
    direction: int
    deviation: float
    line: int


@dataclass(frozen=True, slots=True)
class Instrument:
    """What is known of the indicator, mm or degrees.

    ``resolution`` is its last digit, ``accuracy`` the limit of its error (plus or minus), ``hysteresis`` the limit of
    the difference between its readings going in and coming out, ``misalignment`` the largest angle in degrees between
    indicator and axis.
    """

    resolution: float = 0.0
    accuracy: float = 0.0
    hysteresis: float = 0.0
    misalignment: float = 5.0


@dataclass(frozen=True, slots=True)
class ReadingSet:
    """All readings of one axis.  ``common_zero`` False: the indicator was set anew at each target.

    ``missing`` counts the rows left empty; ``resolution`` is the last digit written, in mm or degrees; ``scale``
    turns a number of the form into mm or degrees.  ``facts`` are the ``# key = value`` lines of the form.
    """

    axis: str
    unit: str
    common_zero: bool
    readings: tuple[Reading, ...]
    missing: int = 0
    resolution: float = 0.0
    scale: float = 1.0
    facts: dict[str, str] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Target:
    """The figures of one target (ISO 230-2:2006, 2.10 to 2.17); None where too few readings leave one open."""

    index: int
    position: float
    n_up: int
    n_down: int
    mean_up: float | None
    mean_down: float | None
    mean: float | None
    reversal: float | None
    s_up: float | None
    s_down: float | None
    repeatability_up: float | None
    repeatability_down: float | None
    repeatability: float | None


@dataclass(frozen=True, slots=True)
class Figure:
    """One figure of the axis: ``symbol``, the clause of ISO 230-2:2006 that defines it, its name, its value or None."""

    symbol: str
    clause: str
    name: str
    value: float | None


@dataclass(frozen=True, slots=True)
class Evaluation:
    """The ISO 230-2 figures of one axis."""

    axis: str
    unit: str
    common_zero: bool
    targets: tuple[Target, ...]
    figures: tuple[Figure, ...]

    def value(self, symbol: str) -> float | None:
        """The value of one figure; raises KeyError for a symbol that does not exist."""
        for figure in self.figures:
            if figure.symbol == symbol:
                return figure.value
        raise KeyError(symbol)


@dataclass(frozen=True, slots=True)
class Contribution:
    """One row of an uncertainty budget: ``kind`` A (from scatter) or B (from knowledge), standard uncertainty ``u``.

    ``freedom`` is its degrees of freedom, infinite for kind B.
    """

    name: str
    kind: str
    u: float
    freedom: float


@dataclass(frozen=True, slots=True)
class LashEstimate:
    """A measured lash: ``lash`` >= 0 and its expanded ``uncertainty`` (k = 2), mm or degrees.

    ``shown`` False: the lash is not larger than its uncertainty.  ``signed`` is the mean reversal value, or the signed
    reading of a coupon, before its size was taken.  ``freedom`` is the effective degrees of freedom, ``factor`` the
    coverage factor that 95 % would need with them.
    """

    axis: str
    unit: str
    signed: float
    lash: float
    uncertainty: float
    shown: bool
    freedom: float
    factor: float
    budget: tuple[Contribution, ...]
    method: str
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Finding:
    """One thing the user must know about the readings: a stable ``code``, a plain ``text``, the lines it concerns."""

    code: int
    text: str
    lines: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True)
class Trend:
    """How the lash of an axis went: ``points`` oldest first (dated ones only).

    ``per_year`` is the slope of the least-squares line in mm (degrees) per year with standard uncertainty
    ``u_per_year``; both None below two dates, the second also where nothing is known of the scatter.
    """

    axis: str
    points: tuple[FormerLash, ...]
    per_year: float | None
    u_per_year: float | None
    verdict: str


@dataclass(frozen=True, slots=True)
class ResidualAxis:
    """What is left on one axis compensated by ``lash`` when the true lash is at either end of its uncertainty.

    ``too_little`` >= 0 is the lash left uncrossed if the true lash is ``highest``; ``too_much`` >= 0 is how far a
    take-up overshoots if it is ``lowest``.  All in mm, or degrees for a rotary axis.
    """

    axis: str
    lash: Decimal
    lowest: Decimal
    highest: Decimal
    too_little: Decimal
    too_much: Decimal

    @property
    def worst(self) -> Decimal:
        """The largest error a take-up of this axis can leave."""
        return max(self.too_little, self.too_much)
