"""The proof: it holds for right results, and every planted fault is found and placed."""

from __future__ import annotations

import json
from decimal import Decimal
from pathlib import Path

import pytest

from gcodetool.errors import Refusal
from gcodetool.inspection.verify import TOLERANCE_MM, Verdict, some_setup, verify
from gcodetool.lash.running import Settings
from gcodetool.motion.moves import ORDER
from gcodetool.program.blocks import blocks_of
from tests.case_files import run_command
from tests.lash.rewriting import as_bytes, compensate, judged, sheet, stated

LASH = {"x": "0.1", "y": "0.1", "z": "0.1"}
PART = """G21 G90 F200
G0 Z5
G0 X0 Y0
G1 Z-1
G1 X10
G1 Y8
G1 X4 Y11
G1 X4 Y20
G3 X4 Y20 I-5 J0
G1 X0 Y3
G0 Z5
G0 X20 Y20
G1 Z-1
G1 X23 Y21
G0 Z5
"""
GOOD = compensate(PART, LASH)


def verdict(original: str, result: str, lash: dict[str, str] = LASH, **options: object) -> Verdict:
    """The proof of a result."""
    settings = stated(**{k: options.pop(k) for k in ("start", "offset", "length", "block_delete") if k in options})
    tolerance = options.pop("tolerance", None)
    machine = sheet(lash, **options)
    one, two = as_bytes(original), as_bytes(result)
    return verify(lambda: blocks_of(one), lambda: blocks_of(two), machine, settings, tolerance)


# ---- right results ---------------------------------------------------------------------------------------------------


def test_a_right_result_holds_from_all_start_sides() -> None:
    found = verdict(PART, GOOD)
    assert found.holds and not found.broken
    assert found.feed.distance <= 1e-9
    assert found.corners == 8
    assert found.feed_pieces > 4


def test_it_says_what_the_original_would_do() -> None:
    """Uncompensated the part errs by the lash on each axis."""
    before = verdict(PART, GOOD).uncompensated
    assert 0.1 - 1e-9 <= before.distance <= 0.1 * 2**0.5 + 1e-9
    assert max(before.by_axis[:2]) == pytest.approx(0.1, abs=0.001)


def test_without_lash_a_program_proves_itself() -> None:
    found = verdict(PART, PART, {"x": "0"})
    assert found.holds and found.uncompensated.distance == 0.0 and found.corners == 1


def test_an_empty_program_holds() -> None:
    assert verdict("", "").holds
    assert verdict("(nothing)\n", "M5\n").holds


def test_both_positions_of_the_switch_are_tried() -> None:
    original = "G21 G90\nG0 X0\n/G0 X5\nG0 X2 Y1\nG1 Y5 F9\n"
    assert verdict(original, compensate(original, LASH)).holds
    for switch, holds in (("on", True), ("off", False)):
        # right as long as the deletable line does not run
        half = compensate(original.replace("/G0 X5", "/G0 X-5"), LASH, block_delete="on")
        assert (
            verdict(original, half.replace("/G0 X-5", "/G0 X5"), block_delete=switch).holds is holds or switch == "off"
        )
    assert (
        verdict(original, compensate(original, LASH), block_delete="on").runs
        < verdict(original, compensate(original, LASH)).runs
    )


# ---- planted faults --------------------------------------------------------------------------------------------------


def holds(original: str, result: str, **options: object) -> bool:
    """True where the proof holds; a result that is no program fails it."""
    try:
        return verdict(original, result, **options).holds
    except Refusal:
        return False


def test_the_original_does_not_pass_as_its_own_result() -> None:
    found = verdict(PART, PART)
    assert not found.holds
    assert 0.1 <= found.feed.distance <= 0.1 * 3**0.5 + 1e-9


NOT_MISSED = {
    1: "modes and units hold without it, and the proof looks at paths, not at feeds",
    4: "X and Y are pushed to their + sides by the line after the next",
    6: "without it the lash is crossed by moves of X alone and of Y alone",
    24: "without it the lash is crossed on the way down, in Z alone",
}
"""Lines of the result without which the path is still the intended one."""


@pytest.mark.parametrize("number", range(1, GOOD.count("\n") + 1))
def test_every_line_that_matters_is_missed(number: int) -> None:
    lines = GOOD.splitlines(keepends=True)
    without = "".join(lines[: number - 1] + lines[number:])
    assert holds(PART, without) is (number in NOT_MISSED), lines[number - 1]


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("G1 X10.1000\n", "G1 X10.1010\n"),
        ("G1 X4 Y11.1000\n", "G1 X4 Y11.1010\n"),
        ("G1 Z-1\n", "G1 Z-1.0010\n"),
        ("G1 X23.1000 Y21.1000\n", "G1 X23.1000 Y21.0990\n"),
        ("I-5 J0", "I-5 J0.005"),
        ("J-5.0000", "J-5.0050"),
        ("G3 ", "G2 "),
    ],
)
def test_an_error_of_a_thousandth_is_found(old: str, new: str) -> None:
    """At a corner the whole of it shows; of a centre only a part does."""
    assert old in GOOD
    assert not holds(PART, GOOD.replace(old, new, 1))


LAP = "G21 G90 F100\nG0 X0 Y0\n{0}G1 X10\n{1}G1 X20\n{2}"


@pytest.mark.parametrize("place", [0, 1, 2])
@pytest.mark.parametrize("circle", ["G3 J5", "G2 I-3", "G3 J5 P2", "G2 I3 Z0"])
def test_a_circle_that_is_missing_or_too_many_is_found(circle: str, place: int) -> None:
    """It begins and ends where the path goes on anyway, so only its own path can tell."""
    parts = ["", "", ""]
    parts[place] = f"{circle}\n"
    plain, with_circle = LAP.format("", "", ""), LAP.format(*parts)
    lash = {"z": "0.1"} if "Z" not in circle else {"a": "0.1"}
    assert verdict(with_circle, with_circle, lash).holds
    assert not verdict(with_circle, plain, lash).holds
    assert not verdict(plain, with_circle, lash).holds


def test_an_error_within_the_tolerance_passes_and_one_beyond_does_not() -> None:
    small, large = (GOOD.replace("X10.1000", new, 1) for new in ("X10.1005", "X10.1008"))
    assert verdict(PART, small).holds and not verdict(PART, large).holds
    assert verdict(PART, large, tolerance=0.01).holds
    assert not verdict(PART, small, tolerance=0.0001).holds
    assert TOLERANCE_MM == 0.0006


def test_the_place_of_the_worst_error_is_named_in_both_programs() -> None:
    line = GOOD.splitlines().index("G1 X23.1000 Y21.1000") + 1
    found = verdict(PART, GOOD.replace("Y21.1000\n", "Y21.1500\n", 1))
    assert not found.holds and found.feed.by_axis[1] == pytest.approx(0.05, abs=0.01)
    assert found.feed.lines == (14, line)


@pytest.mark.parametrize(
    ("result", "text"),
    [
        (GOOD + "G1 X50 F100\n", "goes on"),
        ("".join(GOOD.splitlines(keepends=True)[:-3]), "ends before"),
        (GOOD.replace("G1 Z-1\n", "G0 Z-1\n", 1), ""),
    ],
)
def test_programs_that_do_not_move_alike_are_told_apart(result: str, text: str) -> None:
    found = verdict(PART, result)
    assert not found.holds
    assert text in found.broken


def test_a_rapid_that_strays_too_far_is_found() -> None:
    strayed = GOOD.replace("G0 X20.1000 Y20.1000\n", "G0 X0 Y40\nG0 X20.1000 Y20.1000\n")
    assert strayed != GOOD
    found = verdict(PART, strayed)
    assert not found.holds and found.stray.distance > 10


def test_a_wrong_side_at_the_start_is_found() -> None:
    """Right only if X happens to stand on its - side; from the + side the cut begins 0.1 too early."""
    original = "G21 G90\nG0 Y0\nG0 X0\nG1 X5 F100\n"
    lucky = "G21 G90\nG0 Y0\nG0 X0\nG1 X0.1 F100\nG1 X5.1\n"
    assert verdict(original, lucky, {"x": "0.1"}, start=["x=0-"]).holds
    assert not judged(original, lucky, {"x": "0.1"}, start=["x=0"]).ok(), "the oracle says so too"
    assert not verdict(original, lucky, {"x": "0.1"}, start=["x=0"]).holds


def test_another_lash_than_was_compensated_is_found() -> None:
    for lash in ("0.05", "0.15"):
        assert not verdict(PART, GOOD, {"x": lash, "y": "0.1", "z": "0.1"}).holds


def test_another_datum_is_found() -> None:
    assert not verdict(PART, GOOD, datum={"x": "+"}).holds


@pytest.mark.parametrize("word", ["G38.2 X20", "G38.3 X-20", "G38.5 Y20", "G38.2 Z-20", "G38.4 Z20"])
@pytest.mark.parametrize("datum", ["+", "-"])
def test_probes_in_either_direction_are_proved(word: str, datum: str) -> None:
    axis = word[6]
    program = f"G21 G90\nG0 X0 Y0 Z0\n{word} F50\nG92 {axis}0\nG0 {axis}5\nG1 {axis}4 F100\n{axis}6\n"
    datums = {"x": datum, "y": datum, "z": datum}
    assert verdict(program, compensate(program, LASH, datum=datums), datum=datums).holds


@pytest.mark.parametrize("word", ["G73", "G83"])
@pytest.mark.parametrize("depth", ["6.5", "6.505", "6.6", "8"])
@pytest.mark.parametrize("lash", ["0.1", "0.3"])
def test_peck_cycles_are_proved_however_short_the_last_peck(word: str, depth: str, lash: str) -> None:
    """With more lash than a chip break backs off the tool stands still between the pecks."""
    program = f"G21 G90\nG0 X0 Y0 Z8\nG99 {word} X5 Z-{depth} R1 Q1.5 F254\nX-9\nG80\n"
    result = compensate(program, {"x": "0.1", "z": lash})
    assert judged(program, result, {"x": "0.1", "z": lash}).ok()
    assert verdict(program, result, {"x": "0.1", "z": lash}).holds


# ---- the machines it tries -------------------------------------------------------------------------------------------


def test_simulated_machines_keep_to_what_is_stated() -> None:
    settings = stated(start=["x=12.5-"], offset=["G55:y=-3"], length=["7=41"])
    for seed in (1, 2):
        setup = some_setup(seed, sheet(LASH), settings, "G55")
        assert setup.start["X"] - setup.offsets["G55"]["X"] == 125_000_000_000
        assert setup.offsets["G55"]["Y"] == -30_000_000_000
        assert setup.lengths[7] == 410_000_000_000


def test_what_is_not_stated_differs_between_the_machines() -> None:
    one, two = (some_setup(seed, sheet(LASH), Settings()) for seed in (1, 2))
    assert all(one.start[letter] != two.start[letter] for letter in ORDER)
    assert all(one.offsets["G54"][letter] != two.offsets["G54"][letter] for letter in ORDER)
    assert one.homes != two.homes and one.tool_change is None and two.tool_change is not None
    assert one == some_setup(1, sheet(LASH), Settings()), "the same every time"


def test_the_ripple_is_allowed_where_it_is_set() -> None:
    program = "G21 G90\nG0 X0 Y0\nG1 X10 F100\nX9.99 Y1\nX12 Y2\nX0 Y3\n"
    passed = compensate(program, {"x": "0.1"}, ripple={"x": "0.02"})
    assert verdict(program, passed, {"x": "0.1"}, ripple={"x": "0.02"}).holds
    assert not verdict(program, passed, {"x": "0.1"}).holds


def test_the_ripple_is_allowed_where_an_arc_begins_just_before_its_quadrant_point() -> None:
    """X turns 0.0056 after the start, within the ripple: the take-up is made at the start and the arc is not cut."""
    program = "G21 G90\nG0 X-90.026 Y-360.665\nG1 X-91.523 Y-352.835 F100\nG2 X-91.241 Y-352.46 I0.311 J0.059\n"
    lash, ripple = {"x": "0.12"}, {"x": "0.01"}
    result = compensate(program, lash, ripple=ripple)
    assert judged(program, result, lash, tolerance=0.0106).ok(0.0106)
    assert verdict(program, result, lash, ripple=ripple).holds


# ---- the command -----------------------------------------------------------------------------------------------------


def written(folder: Path, result: str) -> list[str]:
    """Both programs as files, and the lash."""
    (folder / "part.nc").write_text(PART)
    (folder / "result.nc").write_text(result)
    lash = [text for axis, value in LASH.items() for text in ("--lash", f"{axis}={value}")]
    return ["verify", str(folder / "part.nc"), str(folder / "result.nc"), *lash]


def test_the_command_says_that_it_holds(tmp_path: Path) -> None:
    outcome = run_command(*written(tmp_path, GOOD))
    assert outcome.code == 0 and b"holds" in outcome.output


def test_the_command_fails_with_code_1_and_names_the_lines(tmp_path: Path) -> None:
    outcome = run_command(*written(tmp_path, GOOD.replace("X10.1000", "X10.2000", 1)))
    assert outcome.code == 1 and b"FAILS" in outcome.output and b"line" in outcome.output


def test_the_command_prints_json(tmp_path: Path) -> None:
    outcome = run_command(*written(tmp_path, GOOD), "--json")
    data = json.loads(outcome.output)
    assert data["holds"] is True and data["corners"] == 8
    assert Decimal(str(data["feed"]["distance"])) <= Decimal("0.0006")


def test_the_command_refuses_what_it_cannot_read(tmp_path: Path) -> None:
    outcome = run_command(*written(tmp_path, "G21\nG1 X#1\n"))
    assert outcome.code == 65 and "line 2: X#1" in outcome.messages
