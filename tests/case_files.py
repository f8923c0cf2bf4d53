"""Case files of the rewriter: read them, run them through the real command, hold the result against what they say.

A case file begins with ``flags:`` and the options of ``gcodetool compensate``; lines that begin with ``note:`` may
follow.  Then comes the program.  A line ``==== expected`` ends it and begins the expected output; a line
``==== refused: line 3 G41`` says instead at which line and words the program is refused.  A file with neither must
stay as it is, byte for byte.
"""

from __future__ import annotations

import re
import shlex
from dataclasses import dataclass
from pathlib import Path

from typer.testing import CliRunner

from gcodetool.cli.app import app
from gcodetool.cli.exit_codes import ExitCode
from gcodetool.lash.compensate import MARK

FOLDER = Path(__file__).resolve().parents[1] / "fixtures" / "compensate"
EXPECTED = b"==== expected"
_REFUSED = re.compile(rb"==== refused: line (\d+) (.+)")
_HEAD = (b"flags:", b"note:")


@dataclass(frozen=True, slots=True)
class Case:
    """One case: options, program, and what must come of it.

    ``expected`` is None where the program is refused; ``refused`` is (line, words), None where it is not.
    """

    name: str
    flags: tuple[str, ...]
    program: bytes
    expected: bytes | None
    refused: tuple[int, str] | None

    def option(self, name: str) -> list[str]:
        """All values of one option."""
        return [value for flag, value in zip(self.flags, self.flags[1:], strict=False) if flag == name]

    def pairs(self, name: str) -> dict[str, str]:
        """The values of a repeatable option such as ``--lash x=0.1`` by lower-case axis letter."""
        return {axis.lower(): value for axis, _, value in (text.partition("=") for text in self.option(name))}


class NotACase(ValueError):
    """The file does not keep to the form."""


def read_case(path: Path) -> Case:
    """Read one file; raises NotACase."""
    lines = path.read_bytes().splitlines(keepends=True)
    head = 0
    while head < len(lines) and lines[head].startswith(_HEAD):
        head += 1
    flags = [line[len(b"flags:") :].decode() for line in lines[:head] if line.startswith(b"flags:")]
    if len(flags) != 1 or not lines[0].startswith(b"flags:"):
        raise NotACase(f"{path.name}: the first line is no flags line")
    marks = [k for k in range(head, len(lines)) if lines[k].startswith(b"====")]
    if len(marks) > 1:
        raise NotACase(f"{path.name}: more than one marker")
    end = marks[0] if marks else len(lines)
    program = b"".join(lines[head:end])
    if not marks:
        return Case(path.stem, tuple(shlex.split(flags[0])), program, program, None)
    mark = lines[end].rstrip(b"\r\n")
    refused = _REFUSED.fullmatch(mark)
    if not refused and mark != EXPECTED:
        raise NotACase(f"{path.name}: unknown marker {mark!r}")
    return Case(
        name=path.stem,
        flags=tuple(shlex.split(flags[0])),
        program=program,
        expected=None if refused else b"".join(lines[end + 1 :]),
        refused=(int(refused[1]), refused[2].decode("latin-1")) if refused else None,
    )


def all_cases(folder: Path = FOLDER) -> list[Case]:
    """Every case, by name."""
    return [read_case(path) for path in sorted(folder.glob("*.case"))]


@dataclass(frozen=True, slots=True)
class Outcome:
    """What the command did: exit code, standard output, standard error."""

    code: int
    output: bytes
    messages: str


def run_command(*arguments: str, program: bytes = b"") -> Outcome:
    """Run one verb of the real command line inside this process."""
    done = CliRunner().invoke(app, list(arguments), input=program)
    return Outcome(done.exit_code, done.stdout_bytes, done.stderr)


def run_case(case: Case) -> Outcome:
    """The command that a case is about; the comment that states lash and version is taken out of its output."""
    outcome = run_command("compensate", "-", *case.flags, program=case.program)
    kept = [line for line in outcome.output.splitlines(keepends=True) if MARK.encode() not in line]
    return Outcome(outcome.code, b"".join(kept), outcome.messages)


def complaint(case: Case, outcome: Outcome) -> str:
    """What is wrong with an outcome, "" where nothing is."""
    if case.refused is None:
        if outcome.code:
            return f"exit code {outcome.code}: {outcome.messages}"
        return "" if outcome.output == case.expected else "the output is another one"
    line, words = case.refused
    if outcome.code != ExitCode.NOT_UNDERSTOOD or outcome.output:
        return f"not refused: exit code {outcome.code}, {len(outcome.output)} bytes, {outcome.messages}"
    return "" if f"line {line}: {words}: " in outcome.messages else f"refused otherwise: {outcome.messages}"
