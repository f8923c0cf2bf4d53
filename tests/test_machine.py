"""The machine sheet: exact numbers, every fault at once and in words, options laid over a sheet."""

from __future__ import annotations

import datetime
import pickle
import tomllib
from dataclasses import FrozenInstanceError
from decimal import Decimal
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gcodetool.errors import SheetError
from gcodetool.machine import (
    Axis,
    Machine,
    check_sheet,
    machine_from_options,
    parse_sheet,
    read_sheet,
    sheet_template,
)
from gcodetool.sheet_keys import AXIS_KEYS, MACHINE_KEYS

FULL = """
[machine]
name = "old mill"
units = "in"
decimals = 5
take_up_feed = 250
settle_margin = 0.75
[axes.x]
lash = 0.1234567
datum = "+"
ripple = 0.002
travel = [-300, 0.5]
acceleration = 200
max_feed = 3000.5
uncertainty = 0.004
measured = 2024-05-31
method = "indicator"
preload = 0
friction = 80
stiff_side = "-"
history = [
    { measured = 2023-01-31, lash = 0.09, uncertainty = 0.01, method = "indicator" },
    { lash = 3 },
]
[axes.C]
lash = 0.05
"""


def test_every_key_arrives_exactly() -> None:
    machine = parse_sheet(FULL)
    x = Axis(
        "X",
        lash=Decimal("0.1234567"),
        datum=1,
        ripple=Decimal("0.002"),
        travel=(Decimal(-300), Decimal("0.5")),
        acceleration=Decimal(200),
        max_feed=Decimal("3000.5"),
        uncertainty=Decimal("0.004"),
        measured=datetime.date(2024, 5, 31),
        method="indicator",
        preload=Decimal(0),
        friction=Decimal(80),
        stiff_side=-1,
    )
    assert machine == Machine(
        name="old mill",
        units="in",
        axes={"X": x, "C": Axis("C", lash=Decimal("0.05"))},
        decimals=5,
        take_up_feed=Decimal(250),
        settle_margin=Decimal("0.75"),
    )


@given(st.decimals(min_value=0, max_value=2, places=9))
def test_a_lash_is_the_decimal_that_was_written(lash: Decimal) -> None:
    assert parse_sheet(f"[axes.y]\nlash = {lash:f}\n").axis("Y").lash == lash
    assert machine_from_options(lash=[f"y={lash:f}"]).axis("Y").lash == lash


def test_defaults() -> None:
    machine = parse_sheet("[axes.z]\n")
    assert machine.axes == {"Z": Axis("Z", Decimal(0), -1)}
    assert (machine.units, machine.decimals, machine.take_up_feed) == (None, 4, None)
    assert machine.settle_margin == Decimal("0.5")
    assert machine.axis("X") == Axis("X", Decimal(0))


def test_inch_has_one_more_decimal_but_not_for_angles() -> None:
    machine = Machine(decimals=4)
    assert [machine.places("mm"), machine.places("in"), machine.places("in", "A")] == [4, 5, 4]


def test_rotary_axes_are_those_that_turn_about_x_y_z() -> None:
    # ISO 841: A, B and C are the rotary motions about X, Y and Z (from memory).
    assert [letter for letter in "XYZABC" if Axis(letter).rotary] == ["A", "B", "C"]


def test_records_are_frozen_and_survive_pickling() -> None:
    machine = parse_sheet(FULL)
    assert pickle.loads(pickle.dumps(machine)) == machine
    with pytest.raises(FrozenInstanceError):
        machine.axis("X").lash = Decimal(1)  # type: ignore[misc]


@pytest.mark.parametrize("axis", [("U",), ("x",), ("X", Decimal("-0.1")), ("X", Decimal("NaN")), ("X", Decimal(0), 0)])
def test_an_axis_that_makes_no_sense_cannot_be_built(axis: tuple) -> None:
    with pytest.raises(SheetError):
        Axis(*axis)


# Good sheets first, then what is wrong and what the user is told.


@pytest.mark.parametrize(
    "text",
    [
        sheet_template(),
        FULL,
        FULL.replace("\n", "\r\n"),
        "axes.x = {lash = 0.1}",
        "[axes.X]\nlash = 2",
        "[axes.a]\nlash = 0",
    ],
)
def test_a_good_sheet_has_no_fault(text: str) -> None:
    assert check_sheet(text) == []


AXIS = "[axes.x]\n"
FAULTS = [
    pytest.param("", "there is no axis", "[axes.x]", id="empty"),
    pytest.param("[axes]\n", "there is no axis", "[axes.x]", id="no axis"),
    pytest.param("axes.x = 0.1", "axes.x: must be a table", "[axes.x]", id="axis is a number"),
    pytest.param(AXIS + "backlash = 0.1", "unknown key backlash", "did you mean lash?", id="near key"),
    pytest.param(AXIS + "Datum = '+'", "unknown key Datum", "did you mean datum?", id="capital key"),
    pytest.param(AXIS + "qqq = 1", "unknown key qqq", "lash, datum, ripple", id="far key"),
    pytest.param(AXIS + "[machine]\nsetle_margin = 1", "machine: unknown key", "settle_margin", id="machine key"),
    pytest.param(AXIS + "[machin]", "unknown table machin", "did you mean machine?", id="near table"),
    pytest.param("[axes.u]\nlash = 0.1", "axes.u: no such axis", "X Y Z A B C", id="axis letter"),
    pytest.param(AXIS + "[axes.X]", "axis X stands twice", "keep one", id="axis twice"),
    # 1 in = 25.4 mm exactly: NIST SP 811 (2008), appendix B.6.
    pytest.param(AXIS + 'lash = "0.01 in"', "carries a unit", ": 0.254.", id="inch"),
    pytest.param(AXIS + 'lash = "5 thou"', "carries a unit", ": 0.127.", id="thou"),
    pytest.param(AXIS + 'lash = "120 um"', "carries a unit", ": 0.12.", id="micrometres"),
    pytest.param(AXIS + 'lash = "0.1mm"', "carries a unit", ": 0.1.", id="mm"),
    pytest.param(AXIS + 'lash = "0.1"', "stands in quotes", "without: 0.1.", id="quoted"),
    pytest.param(AXIS + 'lash = "0,1"', "decimal comma", "0.1", id="comma in quotes"),
    pytest.param(AXIS + "lash = 0,1", "not TOML", "line 2", id="comma"),
    pytest.param(AXIS + "lash = true", "true is no number", "0.12", id="boolean"),
    pytest.param(AXIS + "lash = -0.1", "negative", "write 0.1", id="negative"),
    pytest.param(AXIS + "lash = 120", "more than 2", "micrometres", id="micrometres without a unit"),
    pytest.param("[axes.a]\nlash = 3", "more than 2", "minutes", id="minutes of arc"),
    pytest.param(AXIS + "lash = inf", "out of reach", "12 places", id="infinite"),
    pytest.param(AXIS + "lash = nan", "out of reach", "12 places", id="nan"),
    pytest.param(AXIS + "lash = 1e-400000", "out of reach", "12 places", id="tiny"),
    pytest.param(AXIS + "max_feed = 1e400000", "out of reach", "12 places", id="huge"),
    pytest.param(AXIS + "max_feed = 1e9999999999999999999999", "not TOML", "", id="beyond decimals"),
    pytest.param(AXIS + "max_feed = " + "9" * 5000, "", "", id="beyond integers"),
    pytest.param(AXIS + "ripple = 5", "more than 2", "micrometres", id="ripple"),
    pytest.param(AXIS + "datum = +", "not TOML", 'datum = "+"', id="datum without quotes"),
    pytest.param(AXIS + 'datum = "left"', "no side", '"+" or "-"', id="datum"),
    pytest.param(AXIS + "datum = 1", "no side", "in quotes", id="datum as number"),
    pytest.param(AXIS + "travel = [0, -300]", "wrong way", "[-300, 0]", id="travel reversed"),
    pytest.param(AXIS + "travel = [5, 5]", "wrong way", "", id="travel empty"),
    pytest.param(AXIS + "travel = 300", "two numbers", "[-200, 0]", id="travel single"),
    pytest.param(AXIS + "acceleration = 0", "more than 0", "leave the key out", id="acceleration"),
    pytest.param(AXIS + "history = 0.1", "history: 0.1 must be a list", "{ lash = 0.12", id="history"),
    pytest.param(AXIS + "history = [{measured = 2024-05-31}]", "must be a list", "lash", id="history without lash"),
    pytest.param(AXIS + "history = [{lash = -1}]", "entry whose lash -1 is negative", "write 1", id="history lash"),
    pytest.param(AXIS + "history = [{lash = 1, a = 2}]", "the key a", "lash, uncertainty", id="history key"),
    pytest.param(AXIS + 'measured = "2024"', "must be a date", "2024-05-31", id="date"),
    pytest.param(AXIS + "measured = 2024-05-31T10:00:00", "must be a date", "", id="date with time"),
    pytest.param(AXIS + "method = 3", "must be text", "in quotes", id="method"),
    pytest.param(AXIS + '[machine]\nunits = "inch"', '"inch" is not known', 'write "in"', id="units inch"),
    pytest.param(AXIS + '[machine]\nunits = "metric"', "is not known", 'write "mm"', id="units metric"),
    pytest.param(AXIS + "[machine]\nunits = 21", 'must be "mm" or "in"', "", id="units number"),
    pytest.param(AXIS + "[machine]\ndecimals = 3", "from 4 to 8", "may refuse a shifted arc", id="few decimals"),
    pytest.param(AXIS + "[machine]\ndecimals = 9", "from 4 to 8", "", id="many decimals"),
    pytest.param(AXIS + "[machine]\ndecimals = 4.0", "whole number", "", id="broken decimals"),
    pytest.param(AXIS + "[machine]\nsettle_margin = 500", "more than 20", "0.5", id="margin"),
    pytest.param(AXIS + "[machine]\ntake_up_feed = 0", "more than 0", "", id="feed"),
    pytest.param("machine = 3\n" + AXIS, "machine: must be a table", "[machine]", id="machine is a number"),
    pytest.param("a = " + "[" * 5000, "not TOML", "", id="deep"),
]


@pytest.mark.parametrize(("text", "fault", "cure"), FAULTS)
def test_a_fault_is_told_once_with_its_cure(text: str, fault: str, cure: str) -> None:
    found = check_sheet(text)
    assert len(found) == 1
    assert fault in found[0]
    assert cure in found[0]
    assert len(found[0]) < 250
    with pytest.raises(SheetError):
        parse_sheet(text)


def test_all_faults_are_told_at_once() -> None:
    text = '[machine]\nunits = "inch"\n[axes.x]\nlash = -1\ndatum = "up"\n[axes.y]\nlahs = 0.1\n'
    places = [fault.split(":")[0] for fault in check_sheet(text)]
    assert places == ["machine.units", "axes.x.lash", "axes.x.datum", "axes.y"]
    with pytest.raises(SheetError) as raised:
        parse_sheet(text, "mill.toml")
    assert str(raised.value).split("\n") == [f"mill.toml: {fault}" for fault in check_sheet(text)]


@given(st.text())
def test_any_text_is_judged_without_a_crash(text: str) -> None:
    assert isinstance(check_sheet(text), list)


def test_the_template_names_every_key_and_can_be_switched_on() -> None:
    switched_on = sheet_template().replace("\n# ", "\n").replace("\nOne table", "\n# One table")
    tree = tomllib.loads(switched_on.removeprefix(sheet_template().split("\n")[0]))
    assert set(tree["machine"]) == set(MACHINE_KEYS)
    assert set(tree["axes"]["x"]) == set(AXIS_KEYS) - {"history"}
    assert check_sheet(switched_on) == []


def test_one_value_can_be_exchanged_in_the_text() -> None:
    """Each key stands alone on its line, so that a measured lash can be written without touching the comments."""
    text = sheet_template()
    lines = [number for number, line in enumerate(text.splitlines()) if line.startswith("lash = 0.0")]
    assert len(lines) == 3
    assert parse_sheet(text.replace("lash = 0.0", "lash = 0.08", 1)).axis("X").lash == Decimal("0.08")


def test_reading_a_file(tmp_path: Path) -> None:
    path = tmp_path / "mill.toml"
    path.write_bytes(b"\xef\xbb\xbf" + FULL.encode())
    assert read_sheet(path) == parse_sheet(FULL)
    path.write_bytes(b"# a\n# caf\xe9\n[axes.x]\n")
    with pytest.raises(SheetError, match="line 2 is not UTF-8"):
        read_sheet(path)
    with pytest.raises(FileNotFoundError):
        read_sheet(tmp_path / "none.toml")


# Options.


def test_options_alone() -> None:
    machine = machine_from_options(lash=["x=0.12", "Y=.09", "a=0.05"], datum=["x=+"], ripple=["z=0.002"], units="mm")
    assert machine == Machine(
        units="mm",
        axes={
            "X": Axis("X", Decimal("0.12"), 1),
            "Y": Axis("Y", Decimal("0.09")),
            "A": Axis("A", Decimal("0.05")),
            "Z": Axis("Z", ripple=Decimal("0.002")),
        },
    )


def test_options_replace_the_sheet_and_leave_the_rest() -> None:
    sheet = parse_sheet(FULL)
    machine = machine_from_options(sheet=sheet, lash=["x=0.2"], take_up_feed="100", settle_margin="1.5", decimals=6)
    assert machine.axis("X").lash == Decimal("0.2")
    assert (machine.axis("X").datum, machine.axis("X").travel) == (1, sheet.axis("X").travel)
    assert (machine.units, machine.name, machine.axis("C")) == ("in", "old mill", sheet.axis("C"))
    assert (machine.take_up_feed, machine.settle_margin, machine.decimals) == (Decimal(100), Decimal("1.5"), 6)
    assert sheet.axis("X").lash == Decimal("0.1234567")
    assert machine_from_options(sheet=sheet) == sheet


@pytest.mark.parametrize(
    ("options", "told"),
    [
        ({"lash": ["x"]}, "--lash x: write one of the axes"),
        ({"lash": ["x="]}, "--lash x=: write one of the axes"),
        ({"lash": ["=0.1"]}, "--lash =0.1: write one of the axes"),
        ({"lash": ["u=0.1"]}, "--lash x=0.12"),
        ({"datum": ["xy=+"]}, "--datum x=+"),
        ({"lash": ["x=0.1", "X=0.2"]}, "given twice"),
        ({"lash": ["x=-0.1"]}, "negative"),
        ({"lash": ["x=0.005in"]}, "0.127"),
        ({"lash": ["x=0,1"]}, "decimal comma; write 0.1"),
        ({"lash": ["x=1,2,3"]}, "is no number"),
        ({"lash": ["x=120"]}, "micrometres"),
        ({"lash": ["a=3"]}, "minutes"),
        ({"lash": ["x=nan"]}, "out of reach"),
        ({"datum": ["x=left"]}, "no side"),
        ({"ripple": ["x=-1"]}, "negative"),
        ({"units": "inches"}, 'write "in"'),
        ({"decimals": 3}, "from 4 to 8"),
        ({"take_up_feed": "fast"}, "--take-up-feed fast: the value is no number"),
        ({"take_up_feed": "0"}, "more than 0"),
        ({"settle_margin": "-1"}, "--settle-margin -1: the value is negative"),
    ],
)
def test_a_wrong_option_is_told(options: dict, told: str) -> None:
    with pytest.raises(SheetError) as raised:
        machine_from_options(**options)
    assert told in str(raised.value)
    assert "\n" not in str(raised.value)


def test_all_wrong_options_are_told_at_once() -> None:
    with pytest.raises(SheetError) as raised:
        machine_from_options(lash=["x=-1", "q=1"], datum=["y=up"], units="inch")
    assert len(str(raised.value).split("\n")) == 4
