"""Real programs, as CAM systems wrote them for people's own parts: rewritten and proved, or refused for a reason.

They are no part of the project; where the folder beside it is absent these tests are skipped.
"""

from __future__ import annotations

from pathlib import Path

import pytest

from gcodetool.cli.exit_codes import ExitCode
from gcodetool.errors import Refusal
from gcodetool.lash.compensate import Compensator
from gcodetool.lash.running import Settings
from gcodetool.machine import Machine
from gcodetool.program.blocks import blocks_of
from gcodetool.program.words import join, split
from tests.case_files import run_command
from tests.lash.rewriting import judged, rewrite, sheet

FOLDER = Path(__file__).resolve().parents[2] / "shared" / "corpus"
LASH = {"x": "0.12", "y": "0.09", "z": "0.04"}
FLAGS = ["-q", "--units", "mm", *(text for axis, b in LASH.items() for text in ("--lash", f"{axis}={b}"))]
LARGE = 300_000
"""Bytes above which a program is left to long runs: the proof runs it on several machines."""
ORACLE_LARGE = 60_000
REFUSED = {"rail-full-circles.nc": (67, "from the centre")}
"""Why a program is refused: here a circle was centred by hand, 3.35 mm off; a controller stops at it too."""

pytestmark = pytest.mark.skipif(not FOLDER.is_dir(), reason="the folder of real programs is not here")


def programs(limit: int = LARGE) -> list[object]:
    """Every program, the large ones marked as long."""
    paths = (
        sorted(p for p in FOLDER.glob("*") if p.suffix in (".nc", ".ngc", ".tap", ".gcode")) if FOLDER.is_dir() else []
    )
    return [pytest.param(p, id=p.name, marks=pytest.mark.long if p.stat().st_size > limit else ()) for p in paths]


@pytest.mark.parametrize("path", programs())
def test_a_real_program_is_rewritten_and_proved_or_refused_for_a_reason(path: Path) -> None:
    outcome = run_command("compensate", "-", *FLAGS, program=path.read_bytes())
    if path.name in REFUSED:
        line, reason = REFUSED[path.name]
        assert outcome.code == ExitCode.NOT_UNDERSTOOD and not outcome.output
        assert f"line {line}: " in outcome.messages and reason in outcome.messages
        return
    assert outcome.code == ExitCode.DONE, outcome.messages
    assert outcome.output and outcome.output != path.read_bytes()


@pytest.mark.parametrize("path", programs(10 * LARGE))
def test_without_lash_a_real_program_comes_out_byte_for_byte(path: Path) -> None:
    data = path.read_bytes()
    for units in ("mm", "in"):
        assert rewrite(data, sheet({}, units=units))[0] == data


@pytest.mark.parametrize("path", programs(10 * LARGE))
def test_words_of_a_real_program_join_to_its_lines(path: Path) -> None:
    for block in blocks_of(path.read_bytes()):
        assert join(split(block.text)) == block.text


@pytest.mark.parametrize("path", programs(ORACLE_LARGE))
def test_the_oracle_agrees_on_real_programs(path: Path) -> None:
    """The radius mismatch that the original's own arcs have is let off; it must not grow."""
    data = path.read_bytes()
    try:
        result, _ = rewrite(data, sheet(LASH))
    except Refusal:
        return
    report = judged(data, result, LASH, seeds=range(2), allow_mismatch=True)
    assert report.ok(), report


@pytest.mark.parametrize("path", programs())
def test_no_more_lines_than_take_ups_settles_and_splits(path: Path) -> None:
    data = path.read_bytes()
    try:
        result, tally = rewrite(data, sheet(LASH))
    except Refusal:
        return
    added = len(list(blocks_of(result))) - len(list(blocks_of(data)))
    assert 0 <= added <= tally.blocks_in_cut + tally.blocks_in_air + tally.settles + tally.splits


@pytest.mark.parametrize("path", programs(10 * LARGE))
def test_units_are_never_guessed(path: Path) -> None:
    """A program that states no units is refused unless they are stated for it."""
    data = path.read_bytes()
    stream = Compensator(Machine(axes=sheet(LASH).axes), Settings(), lambda text: None)
    says = any(
        code in b" ".join(data.upper().split()).replace(b"G020", b"G20") for code in (b"G20", b"G21", b"G70", b"G71")
    )
    try:
        stream.rewrite(blocks_of(data))
    except Refusal as refusal:
        assert says or "mm or inches" in refusal.reason
    else:
        assert says
