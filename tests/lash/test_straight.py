"""Rapids, settles and straight feeds: programs that must stay as they are, then what changes and how.

All axes have lash 0.1 with datum - and stand at 0 on the - side unless a row says otherwise.
"""

from __future__ import annotations

import pytest

from gcodetool.errors import Refusal
from tests.lash.rewriting import assert_right, compensate

LASH = {"x": "0.1", "y": "0.1", "z": "0.1"}
KNOWN = ["x=0-", "y=0-", "z=0-"]


def rewritten(program: str, **options: object) -> str:
    """A program in mm and G90 after its first line, rewritten from the known start; the oracle has agreed."""
    whole = f"G21 G90\n{program}"
    options = {"lash": LASH, "start": KNOWN, **options}
    lash, start = options.pop("lash"), options.pop("start")
    result = compensate(whole, lash, start=start, **options)
    judging = {name: options[name] for name in ("datum", "offset", "length") if name in options}
    ripple = max((float(value) for value in dict(options.get("ripple") or {}).values()), default=0.0)
    settle = float(str(options.get("settle_margin", 0.5)))
    assert_right(whole, result, lash, start=start, tolerance=0.0006 + ripple, settle=settle, **judging)
    first, _, rest = result.partition("\n")
    assert first == "G21 G90"
    return rest


# ---- nothing to do ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "program",
    [
        "G1 X-1 F100\nX-2 Y-3\nX-2\nY-3.5 Z-1",
        "G0 X-1 Y-1\nG1 Z-2 F100\nG0 Z-3",
        "g1x-1f100 (note) ; X99\n\n  \nX-1.5",
        "G1 X0 Y0 Z0 F100",
        "M3 S1000\nG4 X5\nF100\n(X5)",
        "G91\nG1 X-1 F100\nX-0.5\nX0\nG90\nX-2",
        "G3 X-10 Y-10 I0 J-10 F100",  # a quarter on which both axes go -
        "G0 A5\nG1 B-7 F100\nC9",
        "N10 G01 X-1. F100.\nN20 M5\nN30 M30\nX99 Y99",
    ],
)
def test_moves_in_the_datum_direction_stay_as_they_are(program: str) -> None:
    assert rewritten(program) == program


@pytest.mark.parametrize(
    "program",
    ["G1 X1 F100\nX2 Y3\nX2.5", "G0 X1 Y1\nG1 Z2 F100\nG0 Z3", "G91\nG1 X1 F100\nX0.5\nG90\nX2"],
)
def test_so_do_moves_in_plus_from_the_plus_side_of_datum_plus(program: str) -> None:
    plus = {"x": "+", "y": "+", "z": "+"}
    assert rewritten(program, datum=plus, start=["x=0+", "y=0+", "z=0+"]) == program


@pytest.mark.parametrize("lash", [{}, {"x": "0"}, {"x": "0", "y": "0.0", "z": "0.000"}, {"c": "0.5"}, {"x": "0.00004"}])
def test_without_lash_nothing_changes(lash: dict[str, str]) -> None:
    """A lash below half a last digit is none: it cannot be written."""
    program = "%\nG20 G91 g0x1y1\r\nG1 X-1 F5\rX1 Y-1 (\xe9)\nG2 X1 Y1 I.5 J.5\nG28 G91 Z0\nM6 T1\nX5"
    assert compensate(program, lash) == program


def test_an_empty_program_stays_empty() -> None:
    assert compensate("", LASH) == ""
    assert compensate("\n\n(note)\n%\n", LASH) == "\n\n(note)\n%\n"


# ---- feeds -----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("program", "expected"),
    [
        # one line before the block, in the modal state before it
        ("G1 X10 F100", "G1 X0.1000 F100\nG1 X10.1000 F100"),
        ("G1 X10 Y5 F100", "G1 X0.1000 Y0.1000 F100\nG1 X10.1000 Y5.1000 F100"),
        # the shift stays while the side does
        ("G1 X10 F100\nX20\nX30", "G1 X0.1000 F100\nG1 X10.1000 F100\nX20.1000\nX30.1000"),
        ("G1 X10 F100\nX10 Y-1\nX10", "G1 X0.1000 F100\nG1 X10.1000 F100\nX10.1000 Y-1\nX10.1000"),
        # one axis turns, the other goes on
        ("G1 X-1 Y-1 F100\nX5 Y-2", "G1 X-1 Y-1 F100\nG1 X-0.9000\nX5.1000 Y-2"),
        # back to the datum side: numbers are the original ones again
        ("G1 X10 F100\nX5", "G1 X0.1000 F100\nG1 X10.1000 F100\nG1 X10.0000\nX5"),
        # a take-up needs the feed of its block where none was in force
        ("F50\nG1 X10", "F50\nG1 X0.1000\nG1 X10.1000"),
        # a word that moves nothing turns nothing
        ("G1 X0 Y5 F100", "G1 Y0.1000 F100\nG1 X0 Y5.1000 F100"),
        # less than the resolution is rounding, not motion
        ("G1 X-1 F100\nX-0.99995\nX-2", "G1 X-1 F100\nX-0.99995\nX-2"),
        ("G1 X-1 F100\nX-0.9998", "G1 X-1 F100\nG1 X-0.9000\nX-0.8998"),
    ],
)
def test_feeds(program: str, expected: str) -> None:
    assert rewritten(program) == expected


@pytest.mark.parametrize(
    ("program", "expected"),
    [
        ("G1 X-10 F100", "G1 X-0.1000 F100\nG1 X-10.1000 F100"),
        ("G1 X10 F100\nX5", "G1 X10 F100\nG1 X9.9000\nX4.9000"),
    ],
)
def test_feeds_with_datum_plus(program: str, expected: str) -> None:
    assert rewritten(program, datum={"x": "+"}, start=["x=0+"], lash={"x": "0.1"}) == expected


def test_unequal_lash_is_taken_up_on_one_line() -> None:
    program = "G1 X10 Y5 F100\nX9 Y4"
    expected = "G1 X0.3000 Y0.0500 F100\nG1 X10.3000 Y5.0500 F100\nG1 X10.0000 Y5.0000\nX9 Y4"
    assert rewritten(program, lash={"x": "0.3", "y": "0.05"}) == expected


# ---- rapids ----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("program", "expected"),
    [
        ("G0 X10\nX20\nX5", "G0 X10.1000\nX20.1000\nX5"),
        ("G0 X10 Y-10", "G0 X10.1000 Y-10"),
        ("G0 X10\nX10\nY1", "G0 X10.1000\nX10.1000\nY1.1000"),
        # the side of a rapid holds for the feed behind it
        ("G0 X10\nG1 X12 F100", "G0 X10.1000\nG1 X12.1000 F100"),
        # and where the feed turns, the take-up is made while the tool is still in air
        ("G0 X10\nG1 X8 F100", "G0 X10.1000\nG0 X10.0000\nG1 X8 F100"),
    ],
)
def test_rapids(program: str, expected: str) -> None:
    assert rewritten(program) == expected


# ---- what is not known -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("program", "options", "expected"),
    [
        # past the target by lash + 0.5 on the far side, then to it in the datum direction
        ("G0 X5", {}, "G0 X5.6000\nG0 X5.0000"),
        ("G0 X5", {"datum": {"x": "+"}}, "G0 X4.4000\nG0 X5.0000"),
        ("G0 X5 Y7", {}, "G0 X5.6000 Y7.6000\nG0 X5.0000 Y7.0000"),
        ("G0 X5", {"settle_margin": "2"}, "G0 X7.1000\nG0 X5.0000"),
        # Z always from above: with datum + that is the other side
        ("G0 Z5", {}, "G0 Z5.6000\nG0 Z5.0000"),
        ("G0 Z5", {"datum": {"z": "+"}}, "G0 Z5.5000\nG0 Z4.9000"),
        # Z alone may begin on a feed
        ("G1 Z5 F100\nZ1", {}, "G1 Z5.6000 F100\nG1 Z5.0000\nZ1"),
        # a position without a side: a rapid of at least the lash tells the side by itself
        ("G0 X5", {"start": ["x=0"]}, "G0 X5.1000"),
        ("G0 X-5", {"start": ["x=0"]}, "G0 X-5"),
        ("G0 X-0.1", {"start": ["x=0"]}, "G0 X-0.1"),
        ("G0 X-0.09", {"start": ["x=0"]}, "G0 X0.5100\nG0 X-0.0900"),
        ("G0 X0", {"start": ["x=0"]}, "G0 X0.6000\nG0 X0.0000"),
        # an axis without lash needs no settling
        ("G0 X5 Y7", {"lash": {"x": "0.1"}}, "G0 X5.6000 Y7\nG0 X5.0000"),
        # a stop on the block acts after the way back
        ("G0 X5 M0", {}, "G0 X5.6000\nG0 X5.0000 M0"),
    ],
)
def test_the_first_rapid_of_an_unknown_axis(program: str, options: dict[str, object], expected: str) -> None:
    assert rewritten(program, **{"start": [], **options}) == expected


def test_z_never_goes_below_its_target() -> None:
    for datum in ("+", "-"):
        lines = rewritten("G0 Z5", start=[], datum={"z": datum}).splitlines()
        heights = [float(line.partition("Z")[2]) for line in lines]
        # on the lower side the tool stands where datum - commands it, and 0.1 above that with datum +
        above = 0.0 if datum == "-" else 0.1
        assert min(heights) + above == pytest.approx(5.0)


@pytest.mark.parametrize(
    ("program", "words", "reason"),
    [
        ("G1 X5 F100", "X5", "unknown position"),
        ("G0 Y5\nG1 Y4 X5 F100", "X5", "unknown position"),
        ("G1 X5 Z1 F100", "X5", "unknown position"),
        ("G1 A5 F100", "A5", "unknown position"),
        ("G0 X0 Y0\nG2 X5 Y5 J5 Z-1 F100", "G2 X5 Y5 J5 Z-1 F100", "unknown position of Z"),
        ("G2 X5 Y5 J5 F100", "G2 X5 Y5 J5 F100", "unknown position of X"),
        ("G91 G1 X5 F100", "X5", "unknown position"),
        ("G0 X5\nM6\nG1 X9 F100", "X9", "unknown position"),
        ("G0 X5\nG28 X9\nG1 X9 F100", "X9", "unknown position"),
        ("G0 X5\nG53 G0 X9\nG1 X9 F100", "X9", "unknown position"),
        ("G0 X5\nG55\nG1 X9 F100", "X9", "unknown position"),
    ],
)
def test_a_feed_from_an_unknown_side_is_refused_and_the_way_out_said(program: str, words: str, reason: str) -> None:
    with pytest.raises(Refusal) as caught:
        compensate(f"G21 G90\n{program}", {**LASH, "a": "0.1"})
    refusal = caught.value
    assert refusal.words == words and reason in refusal.reason
    assert refusal.line == 2 + program.count("\n")
    assert "rapid" in refusal.way_out and "--start" in refusal.way_out


def test_a_stated_start_off_the_datum_side_is_put_right() -> None:
    """The controller shows 0 but the axis stands on its + side, 0.1 short: a feed is begun where it should."""
    assert rewritten("G0 X5", start=["x=0+"]) == "G0 X5.1000"
    result = compensate("G21 G90\nG1 X5 F100", {"x": "0.1"}, start=["x=0+"])
    assert result == "G21 G90\nG1 X0.1000 F100\nG1 X5.1000 F100"
    result = compensate("G21 G90\nG1 X-5 F100", {"x": "0.1"}, start=["x=0+"])
    assert result == "G21 G90\nG1 X0.1000 F100\nG1 X0.0000\nG1 X-5 F100"


# ---- ripple ----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("places", "take_ups"),
    [
        ([10, 9.99, 10.01, 9.99, 10], 0),
        ([10, 9.97, 10], 2),  # over the ripple: there and back
        ([10, 9.99, 9.98, 9.97], 1),  # creeping: counted from the farthest point
        ([10, 10.01, 9.99, 9.98], 1),
    ],
)
def test_ripple(places: list[float], take_ups: int) -> None:
    """Derived from the deadband rule: over 0.02 back from the farthest point is a reversal."""
    program = "".join(f"G1 X{place} Y{-k} F100\n" for k, place in enumerate(places, 1))
    result = rewritten(program, ripple={"x": "0.02"}, lash={"x": "0.1"}, start=["x=0-"])
    added = result.count("\n") - program.count("\n")
    assert added == 1 + take_ups  # one at the start
