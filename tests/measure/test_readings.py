"""The readings form: units, kinds, comments, decimal commas, and what is refused."""

from __future__ import annotations

import contextlib
import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gcodetool.errors import Refusal
from gcodetool.inspection.readings import instrument_of, read_readings

FORM = """\
# axis = Y
# resolution = 0.01
# instrument = dial on the table
run,direction,target_mm,indicator_mm,note
1,up,10.000,0.00,
1,down,10.000,0.12,  # comment behind
# a comment line
2,up,10.000,0.01,"clean, again"
2,down,10.000,,slipped
"""


def test_a_form_filled_in() -> None:
    found = read_readings(FORM)
    assert (found.axis, found.unit, found.common_zero, found.missing) == ("Y", "mm", False, 1)
    assert [(r.run, r.direction, r.target, r.deviation, r.line) for r in found.readings] == [
        (1, 1, 10.0, 0.0, 5), (1, -1, 10.0, 0.12, 6), (2, 1, 10.0, 0.01, 8),
    ]  # fmt: skip
    assert found.facts["instrument"] == "dial on the table"


@pytest.mark.parametrize(
    ("heading", "value", "deviation"),
    [
        ("position_mm", "10.02", 0.02),
        ("deviation_mm", "0.02", 0.02),
        ("deviation_um", "20", 0.02),
        ("indicator_um", "-20", -0.02),
        ("deviation_in", "0.001", 0.0254),
        ("deviation_thou", "1", 0.0254),
        ("position_in", "0.4", 0.16),
    ],
)
def test_kinds_and_units(heading: str, value: str, deviation: float) -> None:
    found = read_readings(f"run,direction,target_mm,{heading}\n1,up,10,{value}\n", axis="x")
    assert found.readings[0].deviation == pytest.approx(deviation, abs=1e-12)


def test_targets_may_be_in_inches() -> None:
    found = read_readings("run,direction,target_in,position_in\n1,+,1,1.001\n1,-,1,1.005\n", axis="X")
    assert [r.target for r in found.readings] == [25.4, 25.4]
    assert [r.deviation for r in found.readings] == pytest.approx([0.0254, 0.127])


def test_semicolons_and_decimal_commas() -> None:
    found = read_readings("# axis = X\nrun;direction;target_mm;indicator_mm\n1;up;10,5;0,12\n")
    assert (found.readings[0].target, found.readings[0].deviation) == (10.5, 0.12)


def test_tabs_byte_order_mark_and_windows_line_ends() -> None:
    found = read_readings("\ufeff# axis = X\r\nrun\tdirection\ttarget_mm\tindicator_mm\r\n1\tup\t1\t0.5\r\n")
    assert found.readings[0].deviation == 0.5


def test_a_form_saved_by_a_spreadsheet() -> None:
    form = (
        '"# axis = X";;;;\n# accuracy = 0,01;;;;\n;;;;\nrun;direction;target_mm;indicator_mm;note\n1;up;2;0,5;\n;;;;\n'
    )
    found = read_readings(form)
    assert (found.axis, len(found.readings)) == ("X", 1)
    assert instrument_of(found).accuracy == pytest.approx(0.01)


def test_columns_stand_in_any_order_and_others_are_left_unread() -> None:
    found = read_readings("who,Deviation um,target_mm,direction,run\nme,5,1,down,3\n", axis="x")
    assert (found.readings[0].run, found.readings[0].direction) == (3, -1)
    assert found.readings[0].deviation == pytest.approx(0.005)


def test_a_dial_that_falls_towards_plus() -> None:
    plain = read_readings(FORM)
    turned = read_readings(FORM.replace("# axis = Y", "# axis = Y\n# sign = -"))
    assert [r.deviation for r in turned.readings] == [-r.deviation for r in plain.readings]


def test_a_rotary_axis_read_by_a_dial_on_an_arm() -> None:
    """0.1 mm on an arm of 50 mm is 0.1 / 50 radians."""
    form = "# axis = A\n# radius = 50 mm\nrun,direction,target_deg,indicator_mm\n1,up,90,0.1\n"
    found = read_readings(form)
    assert found.unit == "deg"
    assert found.readings[0].deviation == pytest.approx(math.degrees(0.1 / 50))
    assert read_readings(form, radius=100).readings[0].deviation == pytest.approx(math.degrees(0.1 / 100))
    with pytest.raises(Refusal, match="centre"):
        read_readings(form.replace("# radius = 50 mm\n", ""))


@pytest.mark.parametrize(
    ("form", "line", "word"),
    [
        ("", 1, "no reading"),
        ("run,direction,target_mm,indicator_mm\n", 1, "no row"),
        ("run,direction,target_mm,indicator_mm\n1,up,1,\n", 1, "no row"),
        ("run,direction,target_mm\n1,up,1\n", 1, "indicator_mm"),
        ("run,target_mm,indicator_mm\n1,1,0\n", 1, "direction"),
        ("run,direction,target,indicator_mm\n1,up,1,0\n", 1, "target_mm"),
        ("run,direction,target_mm,indicator_mm,indicator_um\n1,up,1,0,0\n", 1, "two columns"),
        ("run,direction,target_mm,indicator_mm\n1,left,1,0\n", 2, "no direction"),
        ("run,direction,target_mm,indicator_mm\n0,up,1,0\n", 2, "whole number"),
        ("run,direction,target_mm,indicator_mm\n1.5,up,1,0\n", 2, "whole number"),
        ("run,direction,target_mm,indicator_mm\n\n1,up,1,0,12\n1,up,x1,0\n", 4, "no number"),
        ("run,direction,target_mm,indicator_mm\n1,up,1,0.1a\n", 2, "no number"),
        ("run,direction,target_mm,indicator_mm\n1,up,1,1e400\n", 2, "out of reach"),
        ("run,direction,target_mm,indicator_mm\n1,up\n", 2, "too short"),
        ("run,direction,target_mm,indicator_mm\n1,up,1,0\n1,up,1.0,0\n", 3, "line 2"),
        ("run,direction,target_mm,position_mm\n1,up,1,200\n", 2, "away from the target"),
        ("run,direction,target_mm,deviation_mm\n1,up,1,60\n", 2, "unit"),
        ("run,direction,target_mm,indicator_deg\n1,up,1,0\n", 1, "moves in mm"),
        ("# sign = -\nrun,direction,target_mm,position_mm\n1,up,1,1\n", 2, "sign"),
        ("# sign = up\nrun,direction,target_mm,indicator_mm\n1,up,1,1\n", 2, "sign"),
    ],
)
def test_what_is_not_understood_is_refused_with_its_line(form: str, line: int, word: str) -> None:
    with pytest.raises(Refusal) as fault:
        read_readings(form, axis="x")
    assert fault.value.line == line
    assert word in str(fault.value)
    assert fault.value.way_out


def test_the_axis_must_be_known() -> None:
    form = "run,direction,target_mm,indicator_mm\n1,up,1,0\n"
    with pytest.raises(Refusal, match="--axis"):
        read_readings(form)
    with pytest.raises(Refusal, match="axis"):
        read_readings(form, axis="q")


def test_the_last_digit_written_is_the_resolution_unless_it_is_stated() -> None:
    form = "# axis = X\nrun,direction,target_mm,indicator_um\n1,up,1,5\n1,down,1,7.5\n"
    found = read_readings(form)
    assert instrument_of(found).resolution == pytest.approx(0.0001)
    assert instrument_of(found, resolution=1).resolution == pytest.approx(0.001)
    stated = read_readings(form.replace("# axis = X", "# axis = X\n# resolution = 2\n# accuracy = 3"))
    assert instrument_of(stated).resolution == pytest.approx(0.002)
    assert instrument_of(stated).accuracy == pytest.approx(0.003)
    assert instrument_of(stated, accuracy=4).accuracy == pytest.approx(0.004)
    with pytest.raises(Refusal, match="accuracy"):
        instrument_of(read_readings(form.replace("# axis = X", "# axis = X\n# accuracy = good")))


@given(st.text())
def test_any_text_is_read_or_refused(text: str) -> None:
    with contextlib.suppress(Refusal):
        assert read_readings(text, axis="x").readings


@given(st.lists(st.text("0123456789.,;-+updown# \n", max_size=30), max_size=5))
def test_any_rows_are_read_or_refused(rows: list[str]) -> None:
    with contextlib.suppress(Refusal):
        assert read_readings("run,direction,target_mm,indicator_mm\n" + "\n".join(rows), axis="x").readings
