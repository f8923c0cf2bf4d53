"""The machine verb: a sheet to start from, faults in words, a summary of a good sheet."""

from __future__ import annotations

from pathlib import Path

from gcodetool.machine import sheet_template

GOOD = b"""[machine]
name = "old mill"
take_up_feed = 250
[axes.x]
lash = 0.120
datum = "+"
travel = [-300, 0]
[axes.a]
lash = 0.05
max_feed = 3600
"""


def test_a_new_sheet_is_the_template(run, tmp_path: Path) -> None:
    assert run("machine", "new").stdout.decode() == sheet_template()
    path = tmp_path / "mill.toml"
    assert run("machine", "new", "-o", path).returncode == 0
    assert path.read_text() == sheet_template()
    path.write_text("mine")
    assert run("machine", "new", "-o", path).returncode == 2
    assert path.read_text() == "mine"


def test_a_new_sheet_is_good_and_says_that_it_has_no_lash_yet(run) -> None:
    done = run("machine", "check", "-", stdin=sheet_template().encode())
    assert done.returncode == 0
    assert b"no axis has lash" in done.stdout


def test_a_good_sheet_is_summed_up_in_plain_columns(run, tmp_path: Path) -> None:
    path = tmp_path / "mill.toml"
    path.write_bytes(GOOD)
    done = run("machine", "check", path)
    assert (done.returncode, done.stderr) == (0, b"")
    assert done.stdout.decode().splitlines() == [
        "old mill: the sheet is good.",
        "axis  lash      datum  ripple  travel        max feed",
        "X     0.120 mm  +      -       -300 to 0 mm  -",
        "A     0.05 deg  -      -       -             3600 deg/min",
        "units of programs that state none: not said, such programs are refused",
        "decimals of a changed word: 4 (inch 5)",
        "take-up feed: 250 mm/min",
        "settle margin: 0.5 mm on top of the lash",
    ]


def test_all_faults_are_told_with_code_1(run, tmp_path: Path) -> None:
    path = tmp_path / "mill.toml"
    path.write_bytes(GOOD.replace(b"0.120", b"-0.12").replace(b"take_up_feed", b"takeup_feed"))
    done = run("machine", "check", path)
    assert (done.returncode, done.stderr) == (1, b"")
    first, second = done.stdout.decode().splitlines()
    assert first == f"{path}: machine: unknown key takeup_feed; did you mean take_up_feed?"
    assert second == f"{path}: axes.x.lash: -0.12 is negative; it is a size: write 0.12, or 0 for none."


def test_a_sheet_that_is_no_text_is_told_with_code_1(run) -> None:
    done = run("machine", "check", "-", stdin=b"# caf\xe9\n[axes.x]\n")
    assert done.returncode == 1
    assert done.stdout == b"standard input: line 1 is not UTF-8 text; save the sheet as UTF-8.\n"


def test_an_empty_sheet_and_a_missing_one(run, tmp_path: Path) -> None:
    assert run("machine", "check", "-").returncode == 1
    assert run("machine", "check", tmp_path / "none.toml").returncode == 74


def test_a_name_in_another_script_survives_a_plain_terminal(run) -> None:
    text = GOOD.replace(b"old mill", "Fr\u00e4se".encode())
    done = run("machine", "check", "-", stdin=text, env={"PYTHONIOENCODING": "ascii"})
    assert done.returncode == 0
    assert done.stdout.startswith(b"Fr\\xe4se: the sheet is good.\n")
