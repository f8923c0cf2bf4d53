"""The command line as a whole: exit codes in one place, version, help, completion, colour, messages."""

from __future__ import annotations

import os
import pty
import re
import subprocess
import sys

import pytest

from gcodetool import __version__
from gcodetool.cli.app import tell
from gcodetool.cli.exit_codes import ExitCode
from gcodetool.cli.streams import OutputRefused, ReaderLeft, ReadFailed, WriteFailed
from gcodetool.cli.terminal import printable, say, watched
from gcodetool.errors import ProofError, Refusal, SheetError


@pytest.mark.parametrize(
    ("fault", "code", "told"),
    [
        (SheetError("one\ntwo"), 2, "gcodetool: one\ngcodetool: two\n"),
        (OutputRefused("x exists"), 2, "gcodetool: x exists\n"),
        (Refusal(7, "G41", "why", "do that"), 65, "gcodetool: line 7: G41: why. do that.\n"),
        (ProofError("worse"), 70, "gcodetool: worse\n"),
        (ReadFailed("cannot read x"), 74, "gcodetool: cannot read x\n"),
        (WriteFailed("cannot write x"), 74, "gcodetool: cannot write x\n"),
        (OSError(5, "Input/output error", "x"), 74, "gcodetool: cannot read or write x: Input/output error\n"),
        (BrokenPipeError(), 141, ""),
        (ReaderLeft("gone"), 141, ""),
        (KeyboardInterrupt(), 130, ""),
    ],
)
def test_each_error_has_its_code_and_words(
    fault: BaseException, code: int, told: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert tell(fault) == code
    assert capsys.readouterr() == ("", told)


def test_codes_follow_the_conventions_they_come_from() -> None:
    # sysexits.h of BSD: EX_DATAERR 65, EX_SOFTWARE 70, EX_IOERR 74 (from memory; Python has them in os).
    assert (ExitCode.NOT_UNDERSTOOD, ExitCode.OWN_FAULT, ExitCode.INPUT_OUTPUT) == (
        os.EX_DATAERR,
        os.EX_SOFTWARE,
        os.EX_IOERR,
    )
    # POSIX shells report a death by signal n as 128 + n: SIGINT 2, SIGPIPE 13, SIGTERM 15.
    assert (ExitCode.INTERRUPTED, ExitCode.READER_LEFT, ExitCode.TERMINATED) == (128 + 2, 128 + 13, 128 + 15)


def test_the_unforeseen_is_a_fault_of_the_tool(drive) -> None:
    done = drive("broken")
    assert (done.returncode, done.stdout) == (70, b"")
    assert b"ZeroDivisionError: broken for the test" in done.stderr
    assert b"do not run what it has written" in done.stderr
    assert all(line.startswith(b"gcodetool: ") for line in done.stderr.splitlines())


def test_version_is_the_bare_number(run) -> None:
    done = run("--version")
    assert (done.returncode, done.stdout.decode(), done.stderr) == (0, __version__ + "\n", b"")
    assert re.fullmatch(r"\d+\.\d+\.\d+\n", done.stdout.decode())


def test_without_a_verb_the_help_is_shown(run) -> None:
    done = run()
    assert (done.returncode, done.stdout) == (2, b"")
    assert b"Usage:" in done.stderr


def test_an_unknown_verb_is_a_usage_error(run) -> None:
    done = run("compensat")
    assert (done.returncode, done.stdout) == (2, b"")
    assert b"No such command" in done.stderr


def test_completion_works(run, environment) -> None:
    asked = {"COMP_WORDS": "gcodetool mach", "COMP_CWORD": "1", "_GCODETOOL_COMPLETE": "complete_bash"}
    call = [sys.executable, "-c", "import sys; sys.argv[0] = 'gcodetool'; from gcodetool.cli.app import main; main()"]
    done = subprocess.run(call, env={**environment, **asked}, capture_output=True, check=False)
    assert done.stdout == b"machine\n"
    assert b"--show-completion" in run("--help").stdout


@pytest.mark.parametrize("variables", [{}, {"FORCE_COLOR": "1"}, {"TERM": "xterm-256color"}])
@pytest.mark.parametrize("arguments", [["--help"], ["machine", "check", "-"], ["nothing"]])
def test_no_escape_reaches_a_pipe(run, arguments: list[str], variables: dict[str, str]) -> None:
    done = run(*arguments, stdin=b"[axes.x]\nlash = 0.1\n", env=variables)
    assert b"\x1b" not in done.stdout + done.stderr


def on_a_terminal(command: list[str], environment: dict[str, str], standard_input: bytes = b"") -> bytes:
    """What a terminal would show of standard output and standard error."""
    ours, theirs = pty.openpty()
    pipes = {"stdin": subprocess.PIPE, "stdout": theirs, "stderr": theirs}
    with subprocess.Popen(command, env=environment, **pipes) as child:
        os.close(theirs)
        assert child.stdin is not None
        child.stdin.write(standard_input)
        child.stdin.close()
        shown = b""
        try:
            while piece := os.read(ours, 4096):
                shown += piece
        except OSError:  # how Linux says that the other end is closed
            pass
    os.close(ours)
    return shown


COLOUR = re.compile(rb"\x1b\[[0-9;]*3[0-9][0-9;]*m")


def test_no_colour_is_honoured_on_a_terminal(command, driver, environment) -> None:
    line, sheet = [*command, "machine", "check", "-"], b"[axes.x]\nlash = 0.1\n"
    terminal = {**environment, "TERM": "xterm-256color"}
    assert b"0.1 mm" in on_a_terminal(line, terminal, sheet)
    for each, text in ((line, sheet), ([*driver, "bar"], b"")):
        assert not COLOUR.search(on_a_terminal(each, {**terminal, "NO_COLOR": "1"}, text))
    assert COLOUR.search(on_a_terminal([*driver, "bar"], terminal))


def test_a_progress_bar_is_drawn_on_a_terminal_only(drive, driver, environment) -> None:
    shown = on_a_terminal([*driver, "bar"], {**environment, "TERM": "xterm"})
    assert b"proving" in shown
    assert b"20000" in shown
    done = drive("bar")
    assert (done.stdout, done.stderr) == (b"20000\n", b"")


def test_watched_lines_are_handed_through_untouched_without_a_terminal() -> None:
    lines = iter([b"a", b"b"])
    assert watched(lines, 2, "label") is lines


def test_the_user_is_told_that_the_terminal_is_read(driver, environment) -> None:
    ours, theirs = pty.openpty()
    pipes = {"stdout": subprocess.PIPE, "stderr": subprocess.PIPE}
    with subprocess.Popen([*driver, "copy", "-"], stdin=theirs, env=environment, **pipes) as child:
        os.close(theirs)
        assert child.stderr is not None
        assert b"reading the program from the terminal" in child.stderr.readline()
        os.write(ours, b"G1 X1\n\x04")
        assert child.wait(timeout=60) == 0
        assert child.stdout is not None
        assert child.stdout.read() == b"G1 X1\n"
    os.close(ours)


def test_quoted_programs_cannot_act_on_the_terminal(capsys: pytest.CaptureFixture[str]) -> None:
    assert printable("X\x1b[2J\x9b\r\x00 caf\xe9") == "X\\x1b[2J\\x9b\\r\\x00 caf\xe9"
    say("line 1: \x1b]0;owned\x07: no")
    assert capsys.readouterr().err == "gcodetool: line 1: \\x1b]0;owned\\x07: no\n"
