"""Records of a job: tools, stock, clamps, material.  Loads neither numpy nor shapely.

Lengths are mm, speeds rpm, feeds mm/min, positions in program coordinates.
"""

from __future__ import annotations

from dataclasses import dataclass

Point = tuple[float, float]
Outline = tuple[Point, ...]
FLAT, BALL, VEE = range(3)
SHAPES = {"flat": FLAT, "ball": BALL, "vee": VEE, "drill": VEE}


@dataclass(frozen=True, slots=True)
class Cutter:
    """One tool.  ``shape`` is flat, ball, vee or drill; ``angle`` the included angle of a vee or drill in degrees.

    ``tip`` is the flat at the tip of a vee, mm across.  ``hand`` is +1 for a right-hand cutter.  ``most_speed`` is
    the speed marked on it, rpm.
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
class StockShape:
    """The stock in plan as an outline (mm), with its top and its bottom; None where nobody said."""

    outline: Outline | None = None
    top: float | None = None
    bottom: float | None = None


@dataclass(frozen=True, slots=True)
class KeepOut:
    """A clamp or a screw: an outline in plan, and the height up to which it stands."""

    name: str
    outline: Outline
    top: float


@dataclass(frozen=True, slots=True)
class Material:
    """Cutting data of a material.

    ``kt``, ``kr``, ``ka`` are cutting coefficients in N/mm^2, ``et``, ``er``, ``ea`` edge coefficients in N/mm
    (tangential, radial, axial).  Where ``kt`` is None the specific force is ``kc11 * h**-mc`` (Kienzle), and ``kr``,
    ``ka`` are its radial and axial shares, without unit. ``low`` and ``high`` are the factors of the stated band.
    ``least_chip`` is the chip below which the edge rubs, ``most_chip`` the chip load not to be passed on a light
    machine; mm.
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

    ``speed`` in rpm and ``feed`` in mm/min count where the program states none.  ``least_speed`` and ``most_speed`` are
    the range of the machine's spindle.  ``tolerance`` is the size error that is worth a finding, mm.
    """

    cutters: tuple[Cutter, ...] = ()
    stock: StockShape = StockShape()
    keep_outs: tuple[KeepOut, ...] = ()
    material: Material | None = None
    speed: float | None = None
    feed: float | None = None
    least_speed: float | None = None
    most_speed: float | None = None
    tolerance: float = 0.05
