"""The lettering example of NISTIR 6556, appendix C.1: order and places of its reversals.

The blocks are spelled anew from what was derived of the example: its arcs, its strokes and the places where an axis
turns.  Strokes that these leave open (their X, and the slant of the W) are ours, so path lengths are not checked.
"""

from __future__ import annotations

import itertools

from gcodetool.lash.reversals import reversals
from gcodetool.motion.moves import Setup
from gcodetool.program.blocks import blocks_of
from tests.motion.driving import moves, place

PROGRAM = b"""n0010 g21 g0 x0 y0 z50
n0020 t1 m6 m3 f20 s4000
n0030 g0 x0 y0 z2
n0040 g1 z-0.5 (H)
n0050 y10
n0060 g0 z2
n0070 y5
n0080 g1 z-0.5
n0090 x7
n0100 g0 z2
n0110 y0
n0120 g1 z-0.5
n0130 y10
n0140 g0 z2
n0150 x11 y2.5
n0160 g1 z-0.5 (e)
n0170 x16
n0180 g3 x13.5 y0 i-2.5
n0190 g0 z2
n0200 x19
n0210 g1 z-0.5 (l)
n0220 y9
n0230 g0 z2
n0240 x24
n0250 g1 z-0.5 (l)
n0260 y0
n0270 g0 z2
n0280 x32.5 y5
n0290 g1 z-0.5 (o)
n0300 g3 j-2.5
n0310 g0 z2
n0320 x42
n0330 g1 z-0.5 (W)
n0340 x43.5 y0
n0350 x45 y3
n0360 x46.5 y0
n0370 x48 y5
n0380 g0 z2
n0390 x57.5
n0400 g1 z-0.5 (o)
n0410 g3 x57.5 j-2.5
n0420 g0 z2
n0430 x64 y0
n0440 g1 z-0.5 (r)
n0450 y5
n0460 y4
n0470 g2 x69 r4
n0480 g0 z2
n0490 x73 y0
n0500 g1 z-0.5 (l)
n0510 y9
n0520 g0 z2
n0530 x81
n0540 g1 z-0.5 (d)
n0550 y0
n0560 x79.5
n0570 g2 y5 j2.5
n0580 g1 x81
n0590 g0 z2
n0600 m2
"""

X = [16, 11, 32.5, 30, 35, 32.5, 57.5, 55, 60, 57.5, 81, 77]
Y = [10, 0, 10, 2.5, 5, 0, 9, 0, 5, 0, 5, 0, 3, 0, 5, 0, 5, 0, 5, 4, 4.8775, 0, 9, 0]
START = Setup(units="mm", start=place(Z=50))


def test_places_of_the_reversals() -> None:
    """Derived: X 12, Y 24, Z 23 turns; the tool change keeps the axes where they are."""
    without_change = PROGRAM.replace(b"m6 ", b"")
    found = list(reversals(blocks_of(without_change), START, {}))
    assert [round(r.position, 4) for r in found if r.axis == "X"] == X
    assert [round(r.position, 4) for r in found if r.axis == "Y"] == Y
    depths = [round(r.position, 4) for r in found if r.axis == "Z"]
    assert depths == [-0.5, 2] * 11 + [-0.5]
    assert {r.axis for r in found} == {"X", "Y", "Z"}


def test_directions_alternate_on_each_axis() -> None:
    found = list(reversals(blocks_of(PROGRAM), START, {}))
    for axis in "XYZ":
        turns = [r.direction for r in found if r.axis == axis]
        assert all(one == -two for one, two in itertools.pairwise(turns))


def test_turns_inside_the_arcs_are_told_from_those_between_blocks() -> None:
    """Derived: inside the e X turns once and Y twice, inside each o X and Y once more than at its start, and so on."""
    found = list(reversals(blocks_of(PROGRAM), START, {}))
    lines = {(r.line, r.axis): 0 for r in found if r.in_arc}
    for r in found:
        if r.in_arc:
            lines[r.line, r.axis] += 1
    e, o, second_o, r_arc, d = (
        PROGRAM[: PROGRAM.index(n)].count(b"\n") + 1 for n in (b"n0180", b"n0300", b"n0410", b"n0470", b"n0570")
    )
    assert lines == {
        (e, "X"): 1,
        (e, "Y"): 1,
        (o, "X"): 2,
        (o, "Y"): 1,
        (second_o, "X"): 2,
        (second_o, "Y"): 1,
        (r_arc, "Y"): 1,
        (d, "X"): 1,
    }


def test_arcs_of_the_example() -> None:
    """Derived: 270 degrees, two full circles, 77.364 degrees, half a turn."""
    sweeps = [round(abs(move.arc.sweep) * 57.29577951, 3) for move in moves(PROGRAM, START) if move.arc]
    assert sweeps == [270.0, 360.0, 360.0, 77.364, 180.0]
