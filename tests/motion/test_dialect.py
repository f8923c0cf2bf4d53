"""The code table against NISTIR 6556, table 4, and ISO 6983-1: groups, completeness, refusals that say the way out."""

from __future__ import annotations

import pytest

from gcodetool.errors import Refusal
from gcodetool.motion.dialect import CYCLES, FRAME_WORDS, G_CODES, M_CODES, PLANE_AXES, PROBES
from gcodetool.motion.modal import ModalState, code_word, g_words, step
from tests.motion.driving import command_of

TABLE_4 = {
    1: "G0 G1 G2 G3 G38.2 G80 G81 G82 G83 G84 G85 G86 G87 G88 G89",
    2: "G17 G18 G19",
    3: "G90 G91",
    5: "G93 G94",
    6: "G20 G21",
    7: "G40 G41 G42",
    8: "G43 G49",
    10: "G98 G99",
    12: "G54 G55 G56 G57 G58 G59 G59.1 G59.2 G59.3",
    13: "G61 G61.1 G64",
}
"""Modal groups of NISTIR 6556, table 4."""
NON_MODAL = "G4 G10 G28 G30 G53 G92 G92.1 G92.2 G92.3"
"""Group 0 of the same table."""
M_WORDS = "M0 M1 M2 M30 M60 M6 M3 M4 M5 M7 M8 M9 M48 M49"
"""The M codes of the same table."""
OUT_OF_SCOPE = ("G41", "G42")
GROUP_OF = {word: group for group, words in TABLE_4.items() for word in words.split()}
USABLE = [word for word in GROUP_OF if word not in OUT_OF_SCOPE]
REFUSED = [code for code in (*G_CODES.values(), *M_CODES.values()) if code.reason]


def sorted_words(*words: str):
    return g_words(tuple(word[1:] for word in words))


# ---- completeness ----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("word", [*GROUP_OF, *NON_MODAL.split()])
def test_every_g_code_of_the_standard_is_in_the_table(word: str) -> None:
    assert word in G_CODES


@pytest.mark.parametrize("word", M_WORDS.split())
def test_every_m_code_of_the_standard_is_in_the_table(word: str) -> None:
    assert word in M_CODES


@pytest.mark.parametrize("word", ["G70", "G71", "G95", "G97", "G9"])
def test_words_of_iso_6983_that_real_programs_carry_are_in_the_table(word: str) -> None:
    """From memory: ISO 6983-1 has inch and metric as G70 and G71, feed per turn as G95."""
    assert word in G_CODES


def test_every_row_says_what_it_does_and_every_refused_one_the_way_out() -> None:
    for word, code in {**G_CODES, **M_CODES}.items():
        assert code.word == word and code.group and code.effect
        assert bool(code.reason) == bool(code.way_out) == (code.effect == "refused")


def test_special_sets_name_codes_of_the_table() -> None:
    assert {*CYCLES, *PROBES, *FRAME_WORDS, *PLANE_AXES} <= set(G_CODES)
    assert all(G_CODES[word].group == "motion" for word in (*CYCLES, *PROBES))


def test_plane_axes_are_right_handed() -> None:
    """NISTIR 6556 3.5.3: arcs are seen from the positive end of the axis normal to XY, ZX and YZ."""
    assert PLANE_AXES == {"G17": ("X", "Y", "Z"), "G18": ("Z", "X", "Y"), "G19": ("Y", "Z", "X")}


# ---- modal groups ----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("one", USABLE)
def test_two_words_of_a_block_exclude_each_other_within_a_group_only(one: str) -> None:
    """NISTIR 6556 3.3.2: a line may have any number of G words, but only one from a modal group.

    G80 beside a motion word is taken as the end of a cycle: real posts write ``G0 G80`` on a safe start line.
    """
    for two in USABLE:
        same = GROUP_OF[one] == GROUP_OF[two] and one != two and "G80" not in (one, two)
        fault = sorted_words(one, two).fault
        assert bool(fault) is same, two
        assert not same or (one in fault[0] and two in fault[0] and fault[1] and fault[2])


@pytest.mark.parametrize("one", ["G10", "G28", "G30", "G92", "G52"])
@pytest.mark.parametrize("two", ["G10", "G28", "G30", "G92", "G4"])
def test_two_words_that_want_the_axis_words_are_refused(one: str, two: str) -> None:
    """NISTIR 6556 3.3.2: axis words belong to one code of a line."""
    if one == two:
        return
    with pytest.raises(Refusal) as caught:
        command_of(f"{one} {two} L20 P1 X1")
    assert caught.value.line == 1 and one in caught.value.words and two in caught.value.words


@pytest.mark.parametrize("motion", ["G2", "G81", "G38.2"])
@pytest.mark.parametrize("other", ["G92", "G10", "G52"])
def test_a_motion_and_a_frame_code_cannot_share_axis_words(motion: str, other: str) -> None:
    """NISTIR 6556 3.3.2: an error if both use axis words."""
    with pytest.raises(Refusal):
        command_of(f"{motion} {other} X1 I1 L20 P1 Z1 R2")


@pytest.mark.parametrize(
    ("words", "field", "before", "after"),
    [
        ("G18", "plane", "G17", "G18"),
        ("G91", "distance", "G90", "G91"),
        ("G20", "units", None, "G20"),
        ("G70", "units", None, "G20"),
        ("G71", "units", None, "G21"),
        ("G90.1", "centre", "G91.1", "G90.1"),
        ("G93", "feed_mode", "G94", "G93"),
        ("G99", "retract", "G98", "G99"),
        ("G55", "offset", None, "G55"),
        ("G2", "motion", "", "G2"),
        ("G0 G80", "motion", "", "G0"),
        ("G80 G1", "motion", "", "G1"),
        ("G80", "motion", "", "G80"),
    ],
)
def test_a_word_changes_its_own_group_and_no_other(words: str, field: str, before: object, after: object) -> None:
    start = ModalState()
    assert getattr(start, field) == before
    then = step(start, sorted_words(*words.split()))
    assert getattr(then, field) == after
    others = [name for name in ModalState.__dataclass_fields__ if name != field]
    assert all(getattr(then, name) == getattr(start, name) for name in others)


@pytest.mark.parametrize("word", [*NON_MODAL.split(), "G52", "G40", "G61", "G64", "G43", "G49", "G9"])
def test_other_words_change_no_mode_that_motion_hangs_on(word: str) -> None:
    state = ModalState(motion="G1", units="G21")
    assert step(state, sorted_words(word)) == state


@pytest.mark.parametrize(
    ("number", "word"),
    [
        ("0", "G0"),
        ("00", "G0"),
        ("01", "G1"),
        ("1.", "G1"),
        ("59.1", "G59.1"),
        ("59.10", "G59.1"),
        (" 2 8", "G28"),
        ("+3", "G3"),
    ],
)
def test_codes_are_known_however_they_are_spelled(number: str, word: str) -> None:
    assert code_word("G", number) == word


@pytest.mark.parametrize(
    ("spread", "apart"),
    [(("9 1",), ("9", "1")), (("0 3",), ("0", "3")), (("5 4",), ("5", "4")), (("2 8", "9 1"), ("2 8", "9", "1"))],
)
@pytest.mark.parametrize("spread_first", [True, False])
def test_a_blank_inside_a_code_is_not_the_gap_between_two(
    spread: tuple[str, ...], apart: tuple[str, ...], spread_first: bool
) -> None:
    """NISTIR 6556 3.3: ``G9 1`` is G91, ``G9 G1`` is an exact stop and a feed, whichever is read first."""
    _forget()
    words = {}
    for numbers in (spread, apart) if spread_first else (apart, spread):
        words[numbers] = g_words(numbers)
    _forget()
    assert words[spread] == g_words(tuple("".join(number.split()) for number in spread))
    assert words[spread] != words[apart]


def _forget() -> None:
    """Fill the bounded memory of sorted words with others, so that what was read before is gone."""
    for k in range(5000):
        g_words((f"4.{k}",))


# ---- refusals --------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("code", REFUSED, ids=lambda code: code.word)
def test_a_refused_code_is_refused_with_line_word_reason_and_way_out(code) -> None:
    with pytest.raises(Refusal) as caught:
        command_of(f"N10 {code.word} X1")
    refusal = caught.value
    assert (refusal.line, refusal.words) == (1, code.word)
    assert refusal.reason == code.reason and refusal.way_out == code.way_out
    assert str(refusal) == f"line 1: {code.word}: {code.reason}. {code.way_out}."


@pytest.mark.parametrize(
    "word", ["G5", "G6", "G7", "G12", "G33", "G44", "G68.2", "G96", "G100", "G92.4", "G1.5", "G999"]
)
def test_an_unknown_g_word_is_refused(word: str) -> None:
    """Some move axes on some machines; none can be passed blindly."""
    with pytest.raises(Refusal) as caught:
        command_of(f"{word} X1")
    assert caught.value.words == word and caught.value.way_out


@pytest.mark.parametrize("word", ["M10", "M64", "M100", "M198", "M999"])
def test_an_unknown_m_word_is_read_without_a_complaint(word: str) -> None:
    assert command_of(f"{word}").m == (word,)
