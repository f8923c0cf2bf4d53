"""Edits of one block: what is not edited stays as it is, and new words look like their neighbours."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gcodetool.program.rewrite import (
    Look,
    join_words,
    lines,
    look_of,
    new_line,
    with_check_sum,
    with_leading_word,
    with_word,
    without_words,
)
from gcodetool.program.words import check_sum, shape_of, split

TEXTS = [
    "",
    "G1 X1 Y2",
    "g1x1y2",
    "/N10\tG01  X1.000 (note)\tY2 ;rest",
    "(a)G1(b)X1(c)",
    "N3 X1*12",
    "  ",
    "%",
]


# ---- nothing to do ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("text", TEXTS)
def test_pieces_without_an_edit_are_the_text(text: str) -> None:
    assert join_words(split(text)) == text


@pytest.mark.parametrize("text", TEXTS)
@pytest.mark.parametrize("ending", ["\n", "\r\n", "\r", ""])
def test_one_line_keeps_its_end(text: str, ending: str) -> None:
    assert lines([text], ending, "\r\n") == text + ending


@pytest.mark.parametrize("text", TEXTS)
def test_taking_out_no_word_changes_nothing(text: str) -> None:
    assert join_words(without_words(split(text), [])) == text


@pytest.mark.parametrize("text", ["N3 X1*113", "N10G1X5*7"])
def test_a_right_line_check_stays(text: str) -> None:
    body = text.partition("*")[0]
    right = f"{body}*{check_sum(body)}"
    assert with_check_sum(right) == right


# ---- new words -------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "result"),
    [
        ("G1 X1", "G1 X1 F300"),
        ("G1X1", "G1X1F300"),
        ("g1 x1", "g1 x1 f300"),
        ("g1x1", "g1x1f300"),
        ("G1 X1 (note)", "G1 X1 F300 (note)"),
        ("G1 X1;note", "G1 X1 F300;note"),
        ("G1\tX1", "G1\tX1 F300"),
        ("X1", "X1 F300"),
    ],
)
def test_a_word_more_stands_behind_the_last_one(text: str, result: str) -> None:
    pieces = split(text)
    look = look_of(pieces, shape_of(pieces).lower)
    assert join_words(with_word(pieces, ("F", "300"), look)) == result


@pytest.mark.parametrize(
    ("text", "result"),
    [
        ("X1 Y2", "G1 X1 Y2"),
        ("N10 X1 Y2", "N10 G1 X1 Y2"),
        ("n10x1y2", "n10g1x1y2"),
        ("(note) X1 Y2", "(note) G1 X1 Y2"),
        ("/X1 Y2", "/G1 X1 Y2"),
        ("X1Y2", "G1X1Y2"),
    ],
)
def test_a_leading_word_stands_behind_the_line_number(text: str, result: str) -> None:
    pieces = split(text)
    look = look_of(pieces, shape_of(pieces).lower)
    assert join_words(with_leading_word(pieces, ("G", "1"), look)) == result


@pytest.mark.parametrize(
    ("text", "letter", "result"),
    [
        ("G1 X1 M30", "M", "G1 X1"),
        ("G1 X1 M30 (end)", "M", "G1 X1 (end)"),
        ("M0 X1 Y2", "M", " X1 Y2"),
        ("(stop) M0 X1", "M", "(stop)  X1"),
        ("/M0 X1", "M", "/ X1"),
        ("G1 X1 (a) P3 Y2", "P", "G1 X1 (a)  Y2"),
    ],
)
def test_a_word_less_leaves_comments_and_slash(text: str, letter: str, result: str) -> None:
    pieces = split(text)
    taken = join_words(without_words(pieces, [shape_of(pieces).at[letter]]))
    assert " ".join(taken.split()) == " ".join(result.split())
    assert list(split(taken)[1::3]) == [p for p in pieces[1::3] if p != letter]


@pytest.mark.parametrize(
    ("look", "text"),
    [
        (Look(), "G1 X0.1000 F50"),
        (Look(between=""), "G1X0.1000F50"),
        (Look(lower=True), "g1 x0.1000 f50"),
        (Look(slash=True), "/G1 X0.1000 F50"),
        (Look(between="", lower=True, slash=True), "/g1x0.1000f50"),
    ],
)
def test_a_new_line_looks_like_its_block(look: Look, text: str) -> None:
    assert new_line([("G", "1"), ("X", "0.1000"), ("F", "50")], look) == text


def test_a_new_line_has_a_line_check_where_its_block_has_one() -> None:
    pieces = split("N3 X1*113")
    text = new_line([("G", "1"), ("X", "2")], look_of(pieces, lower=False))
    body, _, check = text.partition("*")
    assert body == "G1 X2" and int(check) == check_sum(body)


@pytest.mark.parametrize(
    ("texts", "ending", "usual", "result"),
    [
        (["A", "B"], "\n", "\n", "A\nB\n"),
        (["A", "B"], "\r\n", "\n", "A\r\nB\r\n"),
        (["A", "B"], "\r", "\n", "A\rB\r"),
        (["A", "B"], "", "\r\n", "A\r\nB"),  # only the last line may lack its end, as the block did
    ],
)
def test_lines_for_one_block_end_as_it_did(texts: list[str], ending: str, usual: str, result: str) -> None:
    assert lines(texts, ending, usual) == result


@given(st.lists(st.tuples(st.sampled_from("GXYZF"), st.integers(0, 99).map(str)), min_size=1, max_size=6), st.data())
def test_words_taken_out_and_put_in_are_the_only_change(words: list[tuple[str, str]], data: st.DataObject) -> None:
    text = " ".join(letter + number for letter, number in words)
    pieces = split(text)
    gone = data.draw(st.sets(st.integers(0, len(words) - 1)))
    kept = without_words(pieces, [3 * k + 2 for k in gone])
    expected = [word for k, word in enumerate(words) if k not in gone]
    after = split(join_words(kept))
    assert list(zip(after[1::3], after[2::3], strict=True)) == expected
    more = split(join_words(with_word(kept, ("S", "7"), Look())))
    assert list(zip(more[1::3], more[2::3], strict=True)) == [*expected, ("S", "7")]
