"""The measure verb as a user runs it: from nothing to a machine sheet, each of the three ways."""

from __future__ import annotations

import datetime
import json
from decimal import Decimal
from pathlib import Path

import pytest

from gcodetool.machine import parse_sheet
from gcodetool.sheet_edit import FormerLash, current_lash, lash_history
from tests.measure.conftest import FIXTURES
from tests.measure.workshop import Machine, cuts, run

SHEET = """\
# the bench router
[machine]
name = "router"

[axes.x]
lash = 0.10      # by hand
travel = [-300, 0]
max_feed = 2000
acceleration = 200
[axes.y]
lash = 0.08
travel = [-200, 0]
"""


@pytest.fixture
def sheet(tmp_path: Path) -> Path:
    path = tmp_path / "router.toml"
    path.write_text(SHEET, encoding="utf-8")
    return path


def test_from_an_indicator_to_the_sheet(measure, sheet: Path, tmp_path: Path) -> None:
    done = measure(
        "indicator", "x", "--machine", "router.toml", "--cycle", "step", "-o", "test.nc", "--form", "form.csv"
    )
    assert (done.returncode, done.stdout) == (0, "")
    assert "takes about" in done.stderr
    program, form = (tmp_path / "test.nc").read_text(), (tmp_path / "form.csv").read_text()
    assert "(Machine travel -300 to 0; set X zero at machine -300)" in program
    stops = [e for e in run(program, Machine({"X": 0.137})) if e.kind == "stop" and e.message.startswith("Read ")]
    head, rows = form.splitlines()[:5], form.splitlines()[5:]
    # The dial was set at the first reading of each target, and shows two decimals.
    targets = [float(row.split(",")[2]) for row in rows]
    filled = [f"{row[:-1]}{e.after['X'] - t:.2f}," for row, e, t in zip(rows, stops, targets, strict=True)]
    (tmp_path / "form.csv").write_text("\n".join([*head, *filled]))
    done = measure("evaluate", "form.csv", "--accuracy", "0.005", "--write", "router.toml", "--date", "2025-03-01")
    assert done.returncode == 0, done.stderr
    assert "lash of X: 0.1400 mm +- 0.0116 mm (k = 2)" in done.stdout  # sqrt(2) * 0.005 * sqrt(2/3) * 2, and cosine
    text = sheet.read_text()
    assert current_lash(text, "x") == FormerLash(
        Decimal("0.140"), Decimal("0.012"), datetime.date(2025, 3, 1), "indicator, 5 targets, 5 runs from each side"
    )
    assert lash_history(text, "x") == (FormerLash(Decimal("0.10")),)
    assert "# by hand" in text
    assert parse_sheet(text).axes["Y"] == parse_sheet(SHEET).axes["Y"]


def test_from_a_vernier_to_the_sheet(measure, sheet: Path) -> None:
    done = measure("vernier", "--axis", "y", "--machine", "router.toml")
    assert done.returncode == 0
    strokes = cuts(done.stdout, Machine({"Y": 0.161}))
    main = [e.after["Y"] for e in strokes if e.note.startswith("Y: main")]
    apart = [abs(m - e.after["Y"]) for m, e in zip(main, [e for e in strokes if "vernier" in e.note], strict=True)]
    line = apart.index(min(apart)) - 2
    done = measure("read", "y", "--line", line, "--write", "router.toml")
    assert done.returncode == 0
    assert "lash of Y: 0.1600 mm +- 0.0231 mm (k = 2)" in done.stdout
    assert current_lash(sheet.read_text(), "y").lash == Decimal("0.160")
    assert current_lash(sheet.read_text(), "y").measured == datetime.date.today()
    assert "trend of Y" in done.stderr


def test_from_the_tongues_to_the_sheet(measure, sheet: Path) -> None:
    assert measure("tongues", "--spindle", "12000").stdout.count("M3 S12000") == 1
    done = measure("read", "x", "--wide", "0.3240", "--same", "0.3190", "--narrow", "0.3140", "--inch", "--json")
    assert json.loads(done.stdout)["lash"] == pytest.approx(0.127)
    assert done.returncode == 0
    assert sheet.read_text() == SHEET


def test_published_readings_as_tables_json_and_drawing(measure, tmp_path: Path) -> None:
    done = measure("evaluate", FIXTURES / "published_b.csv", "--axis", "x", "--svg", "b.svg")
    assert done.returncode == 0
    for text in ("2.21    0.01369", "602: the lash changes", "deviation, mm", "JCGM 100"):
        assert text in done.stdout
    assert (tmp_path / "b.svg").read_text().startswith("<svg")
    assert measure("evaluate", FIXTURES / "published_b.csv", "--axis", "x", "--svg", "b.svg").returncode == 2
    done = measure("evaluate", FIXTURES / "published_b.csv", "--axis", "x", "--json")
    assert json.loads(done.stdout)["lash"]["shown"] is True


def form_of(*values: str) -> str:
    rows = [
        f"{run},{side},10,{value}"
        for run, pair in enumerate(values, 1)
        for side, value in zip(("up", "down"), pair.split(), strict=True)
    ]
    return "\n".join(["# axis = X", "run,direction,target_mm,indicator_mm", *rows])


def test_doubtful_readings_leave_the_sheet_alone(measure, sheet: Path) -> None:
    form = form_of("0.00 -0.12", "0.01 -0.12", "0.00 -0.11")
    done = measure("evaluate", "-", "--write", "router.toml", stdin=form)
    assert done.returncode == 1
    assert "604: up and down look swapped" in done.stdout
    assert "--accept" in done.stderr
    assert sheet.read_text() == SHEET
    done = measure("evaluate", "-", "--write", "router.toml", "--accept", stdin=form)
    assert done.returncode == 1
    assert current_lash(sheet.read_text(), "x").lash == Decimal("0.120")


def test_no_lash_is_written_as_none(measure, sheet: Path) -> None:
    done = measure("evaluate", "-", "--write", "router.toml", stdin=form_of("0.00 0.00", "0.01 0.01", "0.00 0.01"))
    assert done.returncode == 0
    assert "603: the readings show no lash" in done.stdout
    assert current_lash(sheet.read_text(), "x").lash == 0


def test_trend(measure, sheet: Path) -> None:
    for date, line in (("2024-01-01", 5), ("2025-01-01", 8), ("2026-01-01", 11)):
        measure("read", "x", "--line", line, "--write", "router.toml", "--date", date)
    done = measure("trend", "router.toml")
    assert done.returncode == 0
    assert "2025-01-01  0.160" in done.stdout
    assert "the lash grows" in done.stdout
    trends = json.loads(measure("trend", "router.toml", "--json").stdout)["trends"]
    assert [each["axis"] for each in trends] == ["X", "Y"]
    assert trends[0]["per_year"] == pytest.approx(0.06, abs=0.001)


def test_force(measure, sheet: Path) -> None:
    done = measure(
        "force", "x", "router.toml", "--friction", "0.8", "--jump", "2", "--unit", "kgf", "--stiff-side", "+"
    )
    assert done.returncode == 0
    axis = parse_sheet(sheet.read_text()).axes["X"]
    assert (axis.friction, axis.preload, axis.stiff_side) == (Decimal("7.8"), Decimal("11.7"), 1)
    assert axis.lash == Decimal("0.10")
    assert measure("force", "y", "router.toml", "--friction", "9").returncode == 0
    assert parse_sheet(sheet.read_text()).axes["Y"].preload is None


@pytest.mark.parametrize(
    ("arguments", "code", "word"),
    [
        (("indicator", "q"), 2, "axes are"),
        (("indicator", "x"), 2, "--from"),
        (("indicator", "x", "--from", "0", "--to", "400", "--machine", "router.toml"), 2, "travel"),
        (("indicator", "x", "--cycle", "quick", "--stand", "x=2"), 2, "--stand"),
        (("indicator", "x", "--cycle", "quick", "--overrun", "two"), 2, "two is no number"),
        (("indicator", "x", "--cycle", "quick", "--overrun", "0.15", "--machine", "router.toml"), 2, "overrun"),
        (("vernier", "--axis", "z"), 2, "indicator"),
        (("vernier", "--largest", "2", "--step", "0.05", "--pitch", "300", "--machine", "router.toml"), 2, "travel"),
        (("tongues", "--slot", "3"), 2, "too narrow"),
        (("read", "z", "--line", "3"), 2, "indicator"),
        (("read", "x"), 2, "tongues"),
        (("read", "x", "--line", "3", "--wide", "8"), 2, "not both"),
        (("read", "x", "--line", "3", "--write", "none.toml"), 74, "none.toml"),
        (("read", "x", "--line", "3", "--write", "router.toml", "--date", "today"), 2, "2024-05-31"),
        (("read", "x", "--line", "3", "--step", "-1"), 2, "--step"),
        (("read", "x", "--line", "nan"), 2, "out of reach"),
        (("read", "x", "--wide", "inf", "--narrow", "8"), 2, "out of reach"),
        (("evaluate", "none.csv"), 74, "none.csv"),
        (("evaluate", "-"), 65, "no reading"),
        (("trend", "none.toml"), 74, "none.toml"),
        (("force", "x", "router.toml"), 2, "friction"),
        (("force", "x", "router.toml", "--friction", "5", "--jump", "9"), 2, "--stiff-side"),
        (("force", "x", "router.toml", "--friction", "5", "--stiff-side", "left"), 2, "+ or -"),
    ],
)
def test_what_is_wrong_is_told_and_nothing_is_written(
    measure, sheet: Path, tmp_path: Path, arguments: tuple[str, ...], code: int, word: str
) -> None:
    done = measure(*arguments)
    assert (done.returncode, done.stdout) == (code, "")
    assert word in done.stderr
    assert sheet.read_text() == SHEET
    assert [path.name for path in tmp_path.iterdir()] == ["router.toml"]


def test_files_are_not_overwritten_unless_told(measure, tmp_path: Path) -> None:
    taken = tmp_path / "form.csv"
    taken.write_text("mine")
    arguments = ("indicator", "x", "--cycle", "quick", "-o", "a.nc", "--form", "form.csv")
    assert measure(*arguments).returncode == 2
    assert taken.read_text() == "mine"
    assert not (tmp_path / "a.nc").exists()
    assert measure(*arguments, "--force").returncode == 0
    assert taken.read_text().startswith("# axis = X")


def test_a_broken_sheet_is_not_written_into(measure, sheet: Path) -> None:
    sheet.write_text(SHEET.replace("lash = 0.10", "lahs = 0.10"))
    done = measure("read", "x", "--line", "5", "--write", "router.toml")
    assert done.returncode == 2
    assert "did you mean lash" in done.stderr
    assert "lahs" in sheet.read_text()


def test_a_byte_order_mark_and_windows_line_ends_stay(measure, sheet: Path) -> None:
    sheet.write_bytes(b"\xef\xbb\xbf" + SHEET.replace("\n", "\r\n").encode())
    assert measure("read", "x", "--line", "5", "--write", "router.toml").returncode == 0
    data = sheet.read_bytes()
    assert data.startswith(b"\xef\xbb\xbf#")
    assert data.count(b"\n") == data.count(b"\r\n") > SHEET.count("\n")
