"""What every verb owes its user, whichever verb it is."""

from __future__ import annotations

from pathlib import Path

import pytest
import typer.main

from gcodetool.cli.app import app

LASH = ["--lash", "x=0.1"]
VERBS = sorted(typer.main.get_command(app).commands)  # type: ignore[attr-defined]

# How a verb reads a program from standard input; {file} is a file with the same program.
READING = {
    "compensate": ["compensate", *LASH, "--units", "mm", "-"],
    "reversals": ["reversals", "--units", "mm", "-"],
    "verify": ["verify", *LASH, "--units", "mm", "-", "{file}"],
    "audit": ["audit", *LASH, "--units", "mm", "-"],
}
WITHOUT_PROGRAM = {"machine", "measure"}
READERS = [verb for verb in VERBS if verb in READING]


def test_every_verb_is_listed_here() -> None:
    assert set(VERBS) <= set(READING) | WITHOUT_PROGRAM


@pytest.mark.parametrize("verb", VERBS)
def test_help_is_there_and_says_what_the_verb_does(run, verb: str) -> None:
    done = run(verb, "--help")
    assert (done.returncode, done.stderr) == (0, b"")
    assert f"gcodetool {verb}".encode() in done.stdout
    assert len(done.stdout.split(b"\n\n")[1].strip()) > 20
    assert done.stdout == run(verb, "-h").stdout


@pytest.mark.parametrize("verb", VERBS)
def test_a_bad_option_is_a_usage_error(run, verb: str) -> None:
    done = run(verb, "--no-such-option")
    assert (done.returncode, done.stdout) == (2, b"")
    assert b"no-such-option" in done.stderr


def reading(verb: str, folder: Path, program: bytes) -> list[str]:
    file = folder / "same.nc"
    file.write_bytes(program)
    return [word.format(file=file) for word in READING[verb]]


@pytest.mark.parametrize("verb", READERS)
def test_an_empty_program_is_no_error(run, verb: str, tmp_path: Path) -> None:
    done = run(*reading(verb, tmp_path, b""))
    assert done.returncode == 0
    if verb == "compensate":
        assert done.stdout == b""


PROGRAMS = {
    "crlf": b"G21 G90\r\nG0 X1\r\nG0 X2\r\nM30\r\n",
    "lone cr": b"G21 G90\rG0 X1\rG0 X2\rM30\r",
    "mixed": b"G21 G90\r\nG0 X1\rG0 X2\nM30\n",
    "no last newline": b"G21 G90\nG0 X1\nG0 X2\nM30",
    "not utf-8": b"G21 G90 (caf\xe9 \xff)\nG0 X1\nM30\n",
}


@pytest.mark.parametrize("program", PROGRAMS.values(), ids=PROGRAMS.keys())
@pytest.mark.parametrize("verb", READERS)
def test_endings_and_odd_bytes_are_no_error(run, verb: str, program: bytes, tmp_path: Path) -> None:
    done = run(*reading(verb, tmp_path, program), stdin=program, env={"PYTHONIOENCODING": "utf-8:strict"})
    assert done.returncode == 0, done.stderr
    assert b"Traceback" not in done.stderr
    if verb == "compensate":
        assert done.stdout.count(b"\r") >= program.count(b"\r")
        assert (b"\xff" in done.stdout) == (b"\xff" in program)


@pytest.mark.parametrize("verb", READERS)
def test_a_wrong_lash_is_a_usage_error_before_anything_is_read(run, verb: str, tmp_path: Path) -> None:
    done = run(*reading(verb, tmp_path, b""), "--lash", "y=-1")
    assert (done.returncode, done.stdout) == (2, b"")
    assert b"--lash y=-1" in done.stderr


@pytest.mark.parametrize("verb", READERS)
def test_a_missing_program_is_told(run, verb: str, tmp_path: Path) -> None:
    words = reading(verb, tmp_path, b"")
    done = run(*[str(tmp_path / "none.nc") if word == "-" else word for word in words])
    assert (done.returncode, done.stdout) == (74, b"")
    assert b"none.nc" in done.stderr
