"""The audit verb in a process of its own: tables, JSON, lists, exit codes."""

from __future__ import annotations

import json

import pytest

from tests.audit.conftest import ROOT

PLATE = ROOT / "fixtures" / "plate.nc"
ROUTER = ROOT / "fixtures" / "router.toml"
TOOLS = ["--tool", "1=2", "--tool", "2=1,drill", "--material", "brass"]
JOB = """
[job]
material = "brass"
[stock]
box = [-10, -10, 90, 70]
top = 0
[tools.1]
diameter = 2.0
[tools.2]
diameter = 1.0
shape = "drill"
"""


def test_the_demo_part_in_words(run, tmp_path) -> None:
    (tmp_path / "job.toml").write_text(JOB, encoding="utf-8")
    done = run(PLATE, "--machine", ROUTER, "--job", "job.toml")
    assert (done.returncode, done.stderr) == (0, "")
    for words in (
        "How the cutter cuts",
        "bore 14.000",
        "13.880",
        "take-ups: ",
        "estimate",
        "0.5 to 2 times",
        "Before you cut",
    ):
        assert words in done.stdout
    assert "climb" in done.stdout


def test_every_output_that_shows_figures_says_that_they_are_estimates(run) -> None:
    for more in ([], ["--list"], ["--json"]):
        done = run(PLATE, "--machine", ROUTER, *TOOLS, *more)
        assert "Forces are estimates" in done.stdout
        assert "expect 0.5 to 2 times" in done.stdout
        assert "Sizes are estimates" in done.stdout
        assert "run above the work" in done.stdout


def test_json_holds_everything_and_no_nan(run) -> None:
    done = run(PLATE, "--machine", ROUTER, *TOOLS, "--json", "--list")
    data = json.loads(done.stdout, parse_constant=lambda word: pytest.fail(f"{word} is no JSON"))
    assert (data["schema"], data["units"]) == (1, "mm")
    assert len(data["rows"]) == data["feed_moves"]
    assert {"line", "label", "kind", "force", "holds"} <= set(data["rows"][0])
    assert {each["code"] for each in data["findings"]} >= {701}
    assert data["features"][0]["worst_before"] >= data["features"][-1]["worst_before"]
    assert sum(row["share_of_length"] for row in data["shares"]) == pytest.approx(1.0)
    assert sum(row["share_of_time"] for row in data["shares"]) == pytest.approx(1.0)
    bore = next(each for each in data["features"] if each["name"].startswith("bore 14"))
    assert bore["measures"][0]["before"] == pytest.approx(13.88, abs=1e-4)
    assert bore["lines"] == [50, 50]


def test_a_list_has_one_line_for_each_feed_motion(run) -> None:
    done = run(PLATE, "--machine", ROUTER, *TOOLS, "--list")
    rows = [line for line in done.stdout.splitlines() if not line.startswith("#")]
    assert rows[0].split("\t")[:3] == ["line", "motion", "cut"]
    assert {len(row.split("\t")) for row in rows} == {16}
    assert len(rows) == 1 + 239


def test_the_exit_code_follows_the_severity(run) -> None:
    program = "G21 G90\nS1000 M3\nF100\nG0 X0 Y0 Z5\nG0 Z-1\nG0 X10\n"
    tools = ["--tool", "any=3", "--stock", "box:-20,-20,20,20", "--stock-top", "0"]
    assert run("-", *tools, stdin=program).returncode == 1
    calm = "G21 G90\nS1000 M3\nF100\nG0 Z5\nG1 Z-1\nG1 X10\n"
    assert run("-", *tools, stdin=calm).returncode == 0
    assert run("-", *tools, "--stop-at", "note", stdin=calm).returncode == 1
    assert run("-", *tools, "--stop-at", "caution", stdin=calm).returncode == 0
    assert run("-", *tools, "--stop-at", "never", stdin=calm).returncode == 2


@pytest.mark.parametrize(
    ("arguments", "program", "code", "words"),
    [
        (["--units", "mm"], "G0 Z5\nM3\nG1 Z-1 F100\n", 2, "state its diameter"),
        (["--tool", "any=3"], "G21\nG41 G1 X1 F100\n", 65, "G41"),
        (["--tool", "any=3", "--job", "none.toml"], "", 74, "none.toml"),
        (["--tool", "any"], "", 2, "--tool any"),
        (["--tool", "any=3"], "G0 X1\n", 65, "--units"),
        (["--lash", "x=-1", "--tool", "any=3"], "", 2, "--lash x=-1"),
    ],
)
def test_what_is_wrong_is_told_and_nothing_is_printed(run, arguments, program, code, words) -> None:
    done = run("-", *arguments, stdin=program)
    assert (done.returncode, done.stdout) == (code, "")
    assert words in done.stderr
    assert "Traceback" not in done.stderr


@pytest.mark.parametrize("program", ["", "%\n", "G21 G90\nG0 X1\nG0 X2\nM30\n", "G21 G90 (caf\xe9)\r\nG0 X1\r\nM30"])
def test_programs_without_a_cut_are_no_error(run, program: str) -> None:
    done = run("-", "--units", "mm", stdin=program)
    assert (done.returncode, done.stderr) == (0, "")


def test_materials_are_printed_to_be_edited(run) -> None:
    done = run("--materials")
    assert done.returncode == 0
    assert done.stdout.count("[material]") > 10
    assert "VDI 3323" in done.stdout


def test_words_of_a_program_cannot_act_on_the_terminal(run, tmp_path) -> None:
    done = run("-", "--name", "a\x1b[31mb", "--units", "mm", stdin="G0 X1\n")
    assert "\x1b" not in done.stdout
