"""Every case file through the real command, its expected output before the oracle; every code has one."""

from __future__ import annotations

import difflib
import re
from pathlib import Path

import pytest

from gcodetool.motion.dialect import G_CODES, M_CODES
from tests.case_files import FOLDER, Case, NotACase, all_cases, complaint, read_case, run_case
from tests.lash.rewriting import judged

CASES = all_cases()
CHANGING = [case for case in CASES if case.expected is not None]
UNREAD_BY_THE_ORACLE = ("m-unknown", "pass-codes-of-some-controllers", "style-comment-never-closed")
"""Programs that the oracle's controller stops at: two must stay as they are, the third has a bracket left open."""


def shown(case: Case, output: bytes) -> str:
    """What was expected against what came."""
    texts = [(data or b"").decode("latin-1").splitlines() for data in (case.expected, output)]
    return "\n".join(difflib.unified_diff(*texts, "expected", "output", lineterm=""))


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)
def test_the_command_does_what_the_case_says(case: Case) -> None:
    outcome = run_case(case)
    fault = complaint(case, outcome)
    assert not fault, f"{fault}\n{shown(case, outcome.output)}"


@pytest.mark.parametrize("case", CHANGING, ids=lambda case: case.name)
def test_the_oracle_agrees_with_the_case(case: Case) -> None:
    """A case whose expected output would not cut the intended part is a wrong case."""
    if case.name in UNREAD_BY_THE_ORACLE:
        return
    ripple = max((float(value) for value in case.pairs("--ripple").values()), default=0.0)
    options = {"delete": (case.option("--block-delete") == ["on"],)} if case.option("--block-delete") else {}
    report = judged(
        case.program,
        case.expected or b"",
        case.pairs("--lash"),
        datum=case.pairs("--datum"),
        units=(case.option("--units") or ["mm"])[0],
        start=case.option("--start"),
        offset=case.option("--offset"),
        length=case.option("--length"),
        tolerance=0.0006 + ripple,
        **options,
    )
    assert report.ok(0.0006 + ripple), report


# ---- the code table --------------------------------------------------------------------------------------------------


def codes_of(program: bytes) -> set[str]:
    """The G and M words of a program, as the table spells them; comments, and lines after the end, do not count."""
    found = set()
    for line in program.decode("latin-1").upper().splitlines():
        live = re.sub(r"\(.*?\)|;.*|\(.*", "", line)
        for letter, number in re.findall(r"([GM])\s*(\d+(?:\.\d+)?)", live):
            whole, _, part = number.partition(".")
            found.add(f"{letter}{int(whole)}" + (f".{part}" if part.rstrip("0") else ""))
        if found & {"M2", "M30"}:
            break
    return found


@pytest.mark.parametrize("word", [*G_CODES, *M_CODES])
def test_every_row_of_the_code_table_has_a_case(word: str) -> None:
    code = G_CODES.get(word) or M_CODES[word]
    if code.reason:
        assert any(case.refused and case.refused[1] == word for case in CASES)
    else:
        assert any(word in codes_of(case.program) for case in CHANGING)


def test_words_that_are_in_no_table_have_cases_too() -> None:
    words = {word for case in CHANGING for word in codes_of(case.program)}
    assert any(word not in M_CODES for word in words if word.startswith("M"))
    assert any(case.refused and re.match(r"G\d", case.refused[1]) and case.refused[1] not in G_CODES for case in CASES)


# ---- the form --------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "text",
    [
        "G21\n",
        "note: x\nflags: --lash x=1\n",
        "flags: -q\nG0\n==== expected\nG0\n==== expected\n",
        "flags: -q\n==== wrong\n",
    ],
)
def test_a_file_that_does_not_keep_to_the_form_is_told(tmp_path: Path, text: str) -> None:
    path = tmp_path / "x.case"
    path.write_text(text)
    with pytest.raises(NotACase, match=r"x\.case"):
        read_case(path)


def test_a_case_is_read_byte_for_byte(tmp_path: Path) -> None:
    path = tmp_path / "x.case"
    path.write_bytes(b"flags: --lash x=0.1 --datum x=+\nnote: why\nG21\r\n(\xe9)\r\n==== expected\nG21\r(\xe9)")
    case = read_case(path)
    assert case == Case("x", ("--lash", "x=0.1", "--datum", "x=+"), b"G21\r\n(\xe9)\r\n", b"G21\r(\xe9)", None)
    assert case.pairs("--lash") == {"x": "0.1"} and case.option("--datum") == ["x=+"]


def test_a_case_can_fail() -> None:
    """The runner tells a wrong output, a refusal that does not come, and one that comes for another reason."""
    right = read_case(FOLDER / "g0-rapid.case")
    outcome = run_case(right)
    assert complaint(right, outcome) == ""
    wrong = Case(right.name, right.flags, right.program, right.program, None)
    assert complaint(wrong, outcome) == "the output is another one"
    refused = Case(right.name, right.flags, right.program, None, (1, "G41"))
    assert complaint(refused, outcome).startswith("not refused")
    other = Case(right.name, right.flags, b"G21\nG41\n", None, (2, "G42"))
    assert complaint(other, run_case(other)).startswith("refused otherwise")


def test_the_readme_names_every_form() -> None:
    text = (FOLDER / "README.md").read_text()
    assert all(mark in text for mark in ("flags:", "note:", "==== expected", "==== refused: line 3 G41"))
