"""The codes: stable, in their ranges, explained on the page."""

from __future__ import annotations

import re

import pytest

from gcodetool.inspection.audit_records import Severity
from gcodetool.inspection.findings import CODES, MOST_PLACES, finding, places, sorted_findings
from tests.audit.conftest import ROOT

PAGE = (ROOT / "docs" / "audit.md").read_text(encoding="utf-8")
ROWS = {
    int(code): (severity, text) for code, severity, text in re.findall(r"^\| (\d+) \| (\w+) \| (.*) \|$", PAGE, re.M)
}

# Published once, never changed: a code that goes away leaves a hole.
KNOWN = [*range(101, 109), *range(201, 205), *range(301, 311), *range(401, 404), 501, 502, 701, 702]


def test_the_page_and_the_table_name_the_same_codes_with_the_same_severity() -> None:
    assert {code: severity for code, (severity, _) in ROWS.items()} == {
        code: str(each.severity) for code, each in CODES.items()
    }


def test_codes_are_stable() -> None:
    assert list(CODES) == KNOWN


def test_every_row_explains_and_says_what_to_do() -> None:
    for _, text in ROWS.values():
        what, action = text.split(" | ")
        assert len(what) > 30
        assert len(action) > 10


def test_every_option_on_the_page_exists() -> None:
    source = "".join((ROOT / "gcodetool" / "cli" / name).read_text(encoding="utf-8") for name in
                     ("audit.py", "job_options.py", "options.py", "stated.py"))  # fmt: skip
    for option in set(re.findall(r"(?<![\w-])--[a-z][a-z-]+", PAGE)):
        assert f'"{option}"' in source, option


def test_places_are_told_one_by_one_and_the_rest_as_a_number() -> None:
    found = list(places(301, range(1, 31), [f"place {k}" for k in range(1, 31)]))
    assert len(found) == MOST_PLACES + 1
    assert (found[0].line, found[-1].line, found[-1].count) == (1, MOST_PLACES + 1, 30 - MOST_PLACES)
    assert list(places(301, [], [])) == []


def test_the_worst_comes_first() -> None:
    found = sorted_findings([finding(204, 9, "a"), finding(301, 7, "b"), finding(203, 2, "c"), finding(301, 3, "d")])
    assert [(each.code, each.line) for each in found] == [(301, 3), (301, 7), (203, 2), (204, 9)]
    assert [severity.rank for severity in Severity] == [0, 1, 2]


@pytest.mark.parametrize("code", KNOWN)
def test_a_sentence_and_an_action_for_each(code: int) -> None:
    entry = CODES[code]
    assert entry.title
    assert entry.action[0].isupper()
