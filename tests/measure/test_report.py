"""Tables, charts, drawings and JSON of a lash test."""

from __future__ import annotations

import json
import xml.etree.ElementTree as ET

import pytest

from gcodetool.inspection import readings_findings, uncertainty
from gcodetool.inspection.iso230 import evaluate
from gcodetool.inspection.lash_trend import trend
from gcodetool.inspection.measure_records import Evaluation, Instrument, Reading, ReadingSet
from gcodetool.inspection.readings import read_readings
from gcodetool.report import measuring
from gcodetool.report.measuring_svg import HEIGHT, WIDTH, chart_svg
from gcodetool.sheet_edit import FormerLash
from tests.measure.conftest import FIXTURES, published
from tests.measure.test_trend import value

SVG = "{http://www.w3.org/2000/svg}"


def small(*deviations: tuple[int, float]) -> Evaluation:
    made = tuple(Reading(1.0, run, side, each, 0) for run, (side, each) in enumerate(deviations, 1))
    return evaluate(ReadingSet("X", "mm", True, made))


def test_target_rows_are_the_figures_of_the_targets() -> None:
    rows = measuring.target_rows(evaluate(published("a")))
    assert len(rows) == 6
    assert all(len(row) == len(measuring.TARGET_COLUMNS) for row in rows)
    assert rows[3] == (
        "3", "35.000", "5", "5", "-0.00293", "-0.00742", "+0.00449", "0.00304", "0.00174", "0.01404",
    )  # fmt: skip


def test_missing_figures_are_dashes() -> None:
    assert measuring.target_rows(small((1, 0.5)))[1][4:] == ("+0.5000", "-", "-", "-", "-", "-")
    assert measuring.number(-0.00001, 4) == "0.0000"
    assert measuring.number(-0.00001, 4, sign=True) == "+0.0000"


def test_figure_rows_name_their_clauses() -> None:
    rows = measuring.figure_rows(evaluate(published("a")))
    assert ("E", "2.21", "0.01294", "systematic deviation, both directions") in rows
    assert ("B mean", "2.14", "+0.00037", "mean reversal value, signed") in rows


def test_the_budget_ends_with_its_sum() -> None:
    estimate = uncertainty.lash_from_vernier("X", [7, 8], 0.02)
    rows = measuring.budget_rows(estimate)
    assert rows[-1] == ("combined", "", "0.015", "5.44")
    assert rows[-2] == ("one line to either side", "B", "0.012", "-")


def test_sentences_of_the_lash() -> None:
    assert measuring.lash_sentences(uncertainty.lash_from_vernier("X", [7], 0.02)) == [
        "lash of X: 0.1400 mm +- 0.0231 mm (k = 2)"
    ]
    assert measuring.lash_sentences(uncertainty.lash_from_vernier("X", [1], 0.02)) == [
        "lash of X: none shown; less than 0.0431 mm (k = 2)"
    ]


def test_the_plain_chart() -> None:
    lines = measuring.chart(evaluate(published("b")))
    assert len(lines) == 1 + 2 * 8
    assert all(len(line) <= 79 and line.isascii() for line in lines)
    assert all(("up" in line) == (">" in line) for line in lines[1:])
    assert all(line.index("<") > above.index(">") for above, line in zip(lines[1::2], lines[2::2], strict=True))
    zero = {line.index(":") for line in lines[1:] if ":" in line}
    assert len(zero) == 1


def test_a_dial_set_anew_is_drawn_about_the_mean_of_each_target() -> None:
    data = read_readings((FIXTURES / "step_x.csv").read_text(encoding="utf-8"))
    result = evaluate(data)
    lines = measuring.chart(result)
    assert all(line.index(">") < line.index(":") for line in lines[1::2])
    assert all(line.index(":") < line.index("<") for line in lines[2::2])
    assert [row[0] for row in measuring.figure_rows(result)] == ["B", "B mean", "R up", "R down", "R"]


def test_the_plain_chart_of_almost_nothing() -> None:
    assert len(measuring.chart(small((1, 0.0)))) == 3
    assert ">" in measuring.chart(small((1, 0.0)))[1]
    assert "<" not in measuring.chart(small((1, 0.0)))[2]


@pytest.mark.parametrize("name", ["a", "b"])
def test_the_drawing_shows_every_mean_where_it_belongs(name: str) -> None:
    result = evaluate(published(name))
    root = ET.fromstring(chart_svg(result, "Axis X & <all>"))
    assert root.findtext(f"{SVG}title") == "Axis X & <all>"
    up, down = ([point.split(",") for point in line.get("points", "").split()] for line in root.iter(f"{SVG}polyline"))
    assert len(up) == len(down) == len(result.targets)
    for target, (x, y), (x_down, y_down) in zip(result.targets, up, down, strict=True):
        assert x == x_down
        assert 0 < float(x) < WIDTH
        assert 0 < float(y) < HEIGHT
        assert ((target.reversal or 0) < 0) == (float(y) > float(y_down))
    assert [float(x) for x, _ in up] == sorted(float(x) for x, _ in up)


def test_the_drawing_of_one_reading_is_whole() -> None:
    for evaluation in (small((1, 0.0)), small((-1, 0.3))):
        text = chart_svg(evaluation, "one")
        ET.fromstring(text)
        assert "nan" not in text


def test_json_holds_everything_and_is_strict() -> None:
    data = published("b")
    result = evaluate(data)
    lash = uncertainty.lash_from_readings(result, Instrument(), "test")
    found = readings_findings.findings(data, result, lash, 0.0)
    text = json.dumps(measuring.evaluation_json(result, lash, found), allow_nan=False)
    back = json.loads(text)
    assert {figure["symbol"]: figure["value"] for figure in back["figures"]}["B"] == result.value("B")
    assert len(back["targets"]) == 8
    assert back["lash"]["k"] == 2
    assert back["lash"]["budget"][0]["kind"] == "A"
    assert [finding["code"] for finding in back["findings"]] == [602]
    vernier = measuring.lash_json(uncertainty.lash_from_vernier("X", [7], 0.02))
    assert json.loads(json.dumps(vernier, allow_nan=False))["freedom"] is None


def test_trend_rows_sentence_and_json() -> None:
    undated = FormerLash(value(0, "0.1").lash)
    result = trend("X", [value(0, "0.10"), value(730, "0.20")])
    assert measuring.trend_rows(result, [undated])[0] == ("-", "0.1", "-", "-")
    assert measuring.trend_rows(result)[1] == ("2027-01-01", "0.20", "0.01", "test")
    assert measuring.trend_sentence(result).startswith("trend of X: +0.0500 +- 0.0071 mm per year; the lash grows")
    assert measuring.trend_sentence(trend("X", [])) == "trend of X: one date tells no trend"
    assert json.loads(json.dumps(measuring.trend_json(result)))["points"][0]["measured"] == "2025-01-01"
