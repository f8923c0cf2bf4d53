"""One block to words and back: joining gives the text, and the words are those of RS-274 (NISTIR 6556, 3.3)."""

from __future__ import annotations

import string

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gcodetool.program.words import NotWords, check_sum, is_deletable, join, shape_of, split

LETTERS = "ABCDFGHIJKLMNPQRSTXYZ"
"""The word letters of NISTIR 6556, table 3 (line numbers, which it lists apart, included)."""


def words_of(text: str) -> list[tuple[str, str]]:
    """Upper-case letters and numbers without blanks, as a controller sees them."""
    pieces = split(text)
    return [(a.upper(), "".join(n.split())) for a, n in zip(pieces[1::3], pieces[2::3], strict=True)]


# ---- nothing is lost -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "text",
    [
        "",
        "   ",
        "%",
        "% plate",
        "G1 X1 Y2",
        "g1x1y2",
        "N10 G01 X+1. Y-.5 (note) F300 ; rest",
        "/G1 X1",
        "  /2 G1 X1",
        "(only a comment)",
        "; only a comment",
        "(never closed G1 X1",
        "()G1X1",
        "G1(a)X1(b)Y2(c)",
        "g0x +0. 12 34y 7",
        "N3 T0*57",
        "O1001",
        ":0042 (tape)",
        "\tG1\tX1\t",
        "\xef\xbb\xbfG21",
        "\x00\x00G21",
        "\x1a",
        "(T\xfcr \xe9\xb5)",
    ],
)
def test_joining_gives_the_text(text: str) -> None:
    assert join(split(text)) == text


@given(st.text(st.characters(max_codepoint=255, blacklist_characters="\r\n")))
def test_any_text_comes_back_or_is_named_as_odd(text: str) -> None:
    """What no rule covers raises and quotes what is odd; it never comes back changed."""
    try:
        pieces = split(text)
    except NotWords as odd:
        assert odd.args[0] and odd.args[0] in text
    else:
        assert join(pieces) == text
        assert len(pieces) % 3 == 1


NUMBER = st.from_regex(r"\A[+-]?(?:[0-9]{1,5}(?:\.[0-9]{0,6})?|\.[0-9]{1,6})\Z")
BLANK = st.sampled_from(["", "", " ", "\t", "   "])
COMMENT = st.text(st.characters(max_codepoint=255, blacklist_characters="\r\n()"), max_size=12).map(lambda t: f"({t})")


@st.composite
def blocks(draw: st.DrawFn) -> tuple[str, list[tuple[str, str]]]:
    """A block of the language and the words it is made of."""
    text = draw(st.sampled_from(["", "", "", "/", " /", "/3"]))
    words = []
    for _ in range(draw(st.integers(0, 6))):
        letter = draw(st.sampled_from(LETTERS + LETTERS.lower()))
        number = draw(NUMBER)
        words.append((letter.upper(), number))
        text += draw(BLANK) + draw(st.one_of(st.just(""), COMMENT)) + draw(BLANK) + letter
        text += "".join(draw(BLANK) + character for character in number)
    text += draw(st.one_of(st.just(""), COMMENT, st.just("; G1 X9 (so on")))
    return text, words


@given(blocks())
def test_a_block_of_the_language_has_the_words_it_was_made_of(made: tuple[str, list[tuple[str, str]]]) -> None:
    text, words = made
    assert join(split(text)) == text
    assert words_of(text) == words


# ---- facts of NISTIR 6556, 3.3 ---------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("g0x +0. 12 34y 7", [("G", "0"), ("X", "+0.1234"), ("Y", "7")]),  # the example of 3.3
        ("g0 x+0.1234 y7", [("G", "0"), ("X", "+0.1234"), ("Y", "7")]),
        ("G 1 X - 1 . 5", [("G", "1"), ("X", "-1.5")]),
        ("N5G1X2", [("N", "5"), ("G", "1"), ("X", "2")]),
        ("G1 X1 (MSG, now) Y2", [("G", "1"), ("X", "1"), ("Y", "2")]),
        ("(G1 X5) G0 X1", [("G", "0"), ("X", "1")]),
        ("X1 ; Y2", [("X", "1")]),
        ("/G1 X1", [("G", "1"), ("X", "1")]),
        ("x1f600e41", [("X", "1"), ("F", "600"), ("E", "41")]),  # E is no exponent: 3.3.2.1
        ("", []),
        ("X.5Y-.5Z+.5", [("X", ".5"), ("Y", "-.5"), ("Z", "+.5")]),
        ("G59.1G17", [("G", "59.1"), ("G", "17")]),
    ],
)
def test_words_as_a_controller_reads_them(text: str, words: list[tuple[str, str]]) -> None:
    assert words_of(text) == words


@given(st.sampled_from(LETTERS), NUMBER)
def test_case_means_nothing_outside_comments(letter: str, number: str) -> None:
    """NISTIR 6556 3.3: input is not case sensitive outside comments."""
    assert words_of(letter + number) == words_of(letter.lower() + number)


@pytest.mark.parametrize(
    ("text", "odd"),
    [
        ("G1 X", "X"),  # a word is a letter and a number
        ("X1.2.3", "X1.2.3"),  # at most one point
        ("X#1", "X#1"),
        ("X[1+2]", "X[1+2]"),
        ("#1=5", "#1=5"),
        ("G1 X1 ?", "?"),
        ("WHILE", "WHILE"),
        ("G1 / X1", "/"),  # block delete stands first (3.3)
        ("G1 X1 (a (b) G0 X2 (c)", "(a (b) G0 X2 (c)"),  # comments do not nest (3.3.4)
        ("G1 X1 %", "%"),
        ("X--1", "X--1"),
    ],
)
def test_what_is_neither_word_nor_gap_is_named(text: str, odd: str) -> None:
    with pytest.raises(NotWords) as caught:
        split(text)
    assert caught.value.args[0] == odd


def test_a_comment_with_inner_brackets_and_no_live_code_is_one_gap() -> None:
    """Read either way there is no word in it, so it cannot move an axis."""
    assert words_of("(pocket (rough)) G1 X1") == [("G", "1"), ("X", "1")]
    assert words_of("(tool (3 mm)) X1") == [("X", "1")]


# ---- the shape of a block --------------------------------------------------------------------------------------------


def test_shape_tells_where_the_words_stand() -> None:
    pieces = split("n5 g1 x1 (a) y2 f3 g17 m8")
    shape = shape_of(pieces)
    assert [pieces[i] for i in shape.g] == ["1", "17"]
    assert [pieces[i] for i in shape.m] == ["8"]
    assert {letter: pieces[i] for letter, i in shape.at.items() if letter not in "GM"} == {
        "N": "5",
        "X": "1",
        "Y": "2",
        "F": "3",
    }
    assert shape.axes == (("X", shape.at["X"]), ("Y", shape.at["Y"]))
    assert shape.lower and not shape.plain and shape.twice == ""


@pytest.mark.parametrize(
    ("text", "plain"),
    [("G1 X1 F2", True), ("N1 G0 Z5 A3", True), ("G1 X1 S100", False), ("M3", False), ("G2 X1 I1", False), ("", True)],
)
def test_plain_blocks_hold_moves_and_nothing_else(text: str, plain: bool) -> None:
    assert shape_of(split(text)).plain is plain


@pytest.mark.parametrize(
    ("text", "letter"), [("X1 X2", "X"), ("G1 F1 X1 F2", "F"), ("G1 G17 M3 M8", ""), ("X1 Y1", "")]
)
def test_a_letter_that_stands_twice_is_named(text: str, letter: str) -> None:
    """NISTIR 6556 3.3.2: any letter but G and M at most once."""
    assert shape_of(split(text)).twice == letter


def test_axes_come_in_the_order_of_iso_841_whatever_their_order_in_the_block() -> None:
    """NISTIR 6556 3.3.2: the order of words in a line does not matter."""
    assert [letter for letter, _ in shape_of(split("C1 Z2 A3 X4 B5 Y6")).axes] == list("XYZABC")


def test_shapes_are_alike_for_more_blocks_than_are_remembered() -> None:
    """The memory of shapes is bounded; what fell out is made anew."""
    for k in range(5000):
        letters = (
            string.ascii_uppercase[k % 26] + string.ascii_uppercase[k // 26 % 26] + string.ascii_uppercase[k // 676]
        )
        shape_of(split("".join(f"{letter}1" for letter in letters)))
    assert [letter for letter, _ in shape_of(split("X1 Y2")).axes] == ["X", "Y"]


# ---- block delete and line checks ------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "deletable"),
    [
        ("/G1 X1", True),
        ("  /G1 X1", True),
        ("/2 G1 X1", True),
        ("G1 X1", False),
        ("(/) G1", False),
        ("; /", False),
        ("/", True),
    ],
)
def test_block_delete_is_the_slash_that_leads(text: str, deletable: bool) -> None:
    assert is_deletable(split(text)) is deletable


def test_check_sum() -> None:
    """Exclusive or of the characters: common practice of serial links, no source; 57 for ``N3 T0`` from memory."""
    assert check_sum("N3 T0") == 57
    assert check_sum("") == 0
    assert words_of("N3 T0*57") == [("N", "3"), ("T", "0")]


@given(st.text(st.characters(max_codepoint=255), max_size=30), st.text(st.characters(max_codepoint=255), max_size=30))
def test_check_sums_of_parts_combine(one: str, two: str) -> None:
    assert check_sum(one + two) == check_sum(one) ^ check_sum(two)
