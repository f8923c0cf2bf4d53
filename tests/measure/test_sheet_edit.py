"""Values written into a sheet: nothing else changes, and what cannot be changed safely is left alone."""

from __future__ import annotations

import contextlib
import datetime
import tomllib
from decimal import Decimal

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gcodetool.errors import SheetError
from gcodetool.machine import parse_sheet, sheet_template
from gcodetool.sheet_edit import FormerLash, current_lash, lash_history, set_values, spell, write_lash

D = Decimal
DAY = datetime.date(2024, 5, 31)
SHEET = """\
# My router

[machine]
name = "router [axes.x]"   # not a table

[axes.x]   # the long axis
lash = 0.12      # found by pushing
datum = "-"
# ripple = 0.002

[ axes . "y" ]
lash = 0.09
travel = [
    -200,  # left
    0,
]

# the end
"""
NEW = FormerLash(D("0.134"), D("0.012"), DAY, "vernier")


def test_a_value_is_exchanged_in_its_line() -> None:
    after = set_values(SHEET, "X", {"lash": D("0.100"), "datum": "+"})
    assert after == SHEET.replace("lash = 0.12  ", "lash = 0.100  ").replace('datum = "-"', 'datum = "+"')


def test_writing_a_lash_keeps_all_else_and_the_former_one() -> None:
    after = write_lash(SHEET, "x", NEW)
    kept = [line for line in SHEET.splitlines() if not line.startswith("lash = 0.12")]
    lines = after.splitlines()
    rest = iter(lines)
    assert all(line in rest for line in kept)  # all there, in their order
    assert "lash = 0.134      # found by pushing" in lines
    assert parse_sheet(after).axes["X"].lash == D("0.134")
    assert parse_sheet(after).axes["X"].measured == DAY
    assert parse_sheet(after).axes["Y"] == parse_sheet(SHEET).axes["Y"]
    assert current_lash(after, "x") == NEW
    assert lash_history(after, "x") == (FormerLash(D("0.12")),)


def test_history_grows_by_one_each_time_and_the_same_value_is_kept_once() -> None:
    text, values = SHEET, [FormerLash(D("0.12"))]
    for day in range(1, 5):
        value = FormerLash(D("0.12") + D(day) / 100, D("0.01"), datetime.date(2024, 1, day), "indicator")
        text = write_lash(write_lash(text, "X", value), "X", value)
        assert lash_history(text, "X") == tuple(values)
        values.append(value)
        parse_sheet(text)


def test_a_lash_of_zero_that_nobody_measured_is_no_history() -> None:
    after = write_lash(sheet_template(), "x", NEW)
    assert lash_history(after, "x") == ()
    assert parse_sheet(after).axes["X"].uncertainty == D("0.012")
    for line in sheet_template().splitlines():
        if line.startswith("#"):
            assert line in after.splitlines()


def test_an_axis_without_a_table_gets_one_at_the_end() -> None:
    after = write_lash(SHEET.rstrip("\n"), "Z", NEW)
    assert after.startswith(SHEET.rstrip("\n"))
    assert parse_sheet(after).axes["Z"].lash == D("0.134")
    assert lash_history(after, "Z") == ()


def test_the_spelling_of_the_letter_is_kept() -> None:
    after = set_values("[axes.X]\nlash = 0.1\n", "x", {"lash": D("0.2")})
    assert after == "[axes.X]\nlash = 0.2\n"


def test_a_key_is_taken_out() -> None:
    assert set_values(SHEET, "x", {"datum": None, "method": None}) == SHEET.replace('datum = "-"\n', "")


def test_a_value_of_several_lines_is_exchanged_whole() -> None:
    first = write_lash(write_lash(SHEET, "y", NEW), "y", FormerLash(D("0.2"), None, DAY, 'by "eye"'))
    assert lash_history(first, "y") == (FormerLash(D("0.09")), NEW)
    assert current_lash(first, "y") == FormerLash(D("0.2"), None, DAY, 'by "eye"')
    assert parse_sheet(first).axes["Y"].travel == (D(-200), D(0))


def test_windows_line_ends_stay() -> None:
    after = write_lash(SHEET.replace("\n", "\r\n"), "x", NEW)
    assert after == write_lash(SHEET, "x", NEW).replace("\n", "\r\n")


@pytest.mark.parametrize(
    "text",
    [
        "axes = { x = { lash = 0.1 } }\n",
        "[axes]\nx = { lash = 0.1 }\n",
        "[axes]\nx.lash = 0.1\n",
        "axes.x.lash = 0.1\n",
        '[axes.x]\nmethod = """\nlash = 0.1\n"""\nlash = 0.2 \n[axes]\n',
    ],
)
def test_a_sheet_written_another_way_is_changed_rightly_or_not_at_all(text: str) -> None:
    with contextlib.suppress(SheetError):
        after = set_values(text, "x", {"lash": D("0.3")})
        before = tomllib.loads(text)
        before["axes"]["x"]["lash"] = 0.3
        assert tomllib.loads(after) == before


def test_an_inline_table_is_refused_with_the_way_out() -> None:
    with pytest.raises(SheetError, match=r"left as it was.*\[axes\.x\] on a line of its own"):
        set_values("axes = { x = { lash = 0.1 } }\n", "x", {"lash": D("0.3")})


def test_what_is_no_toml_is_refused() -> None:
    with pytest.raises(SheetError, match="not TOML"):
        set_values("[axes.x]\nlash = 0,1\n", "x", {"lash": D(1)})
    with pytest.raises(SheetError, match="axes are"):
        set_values(SHEET, "q", {"lash": D(1)})
    with pytest.raises(SheetError, match="no lash"):
        lash_history("[axes.x]\nhistory = [{ measured = 2024-05-31 }]\n", "x")
    with pytest.raises(SheetError, match="one line"):
        set_values(SHEET, "x", {"method": "two\nlines"})


def test_spelling() -> None:
    assert spell(D("1E-3")) == "0.001"
    assert spell(DAY) == "2024-05-31"
    assert spell('say "x"\\') == '"say \\"x\\"\\\\"'
    assert spell([NEW]) == (
        '[\n    { measured = 2024-05-31, lash = 0.134, uncertainty = 0.012, method = "vernier" },\n]'
    )


sizes = st.decimals(0, 2, places=4, allow_nan=False)
texts = st.text(st.characters(exclude_categories=("C", "Z")) | st.just(" "), max_size=20).filter(str.isprintable)
values = st.builds(
    FormerLash, sizes, st.none() | sizes, st.none() | st.dates(datetime.date(1990, 1, 1)), st.none() | texts
)


@given(st.lists(values, min_size=1, max_size=5), st.sampled_from("xyz"))
def test_any_series_of_values_comes_back(series: list[FormerLash], axis: str) -> None:
    text = SHEET
    for value in series:
        text = write_lash(text, axis, value)
        assert current_lash(text, axis) == value
        parse_sheet(text)
    for line in SHEET.splitlines():
        if line.startswith(("#", "name")):
            assert line in text.splitlines()
    others = {key: table for key, table in tomllib.loads(SHEET)["axes"].items() if key != axis}
    assert {key: table for key, table in tomllib.loads(text)["axes"].items() if key != axis} == others


@given(st.text("[]axes.xy=\n #\"'{}0123lh-", max_size=60))
def test_any_text_is_changed_rightly_or_refused(text: str) -> None:
    with contextlib.suppress(SheetError):
        after = set_values(text, "x", {"lash": D("0.3")})
        assert tomllib.loads(after)["axes"]["x"]["lash"] == 0.3
