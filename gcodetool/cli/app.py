"""The command line: verbs, version, and the one place where errors become exit codes and messages."""

from __future__ import annotations

import contextlib
import signal
import sys
import traceback
from collections.abc import Iterator
from typing import Annotated, Any

import typer
from typer.core import TyperGroup

from gcodetool import __version__
from gcodetool.cli import audit, compensate, machine_sheet, measure, reversals, verify
from gcodetool.cli.exit_codes import ExitCode
from gcodetool.cli.streams import OutputRefused, ReaderLeft, ReadFailed, WriteFailed, flush_standard_output
from gcodetool.cli.terminal import say
from gcodetool.errors import GcodetoolError, ProofError, Refusal, SheetError

_CODES: dict[type[BaseException], ExitCode] = {
    SheetError: ExitCode.USAGE,
    OutputRefused: ExitCode.USAGE,
    Refusal: ExitCode.NOT_UNDERSTOOD,
    ProofError: ExitCode.OWN_FAULT,
    ReadFailed: ExitCode.INPUT_OUTPUT,
    WriteFailed: ExitCode.INPUT_OUTPUT,
    BrokenPipeError: ExitCode.READER_LEFT,
    OSError: ExitCode.INPUT_OUTPUT,
    ReaderLeft: ExitCode.READER_LEFT,
    KeyboardInterrupt: ExitCode.INTERRUPTED,
}


def tell(fault: BaseException) -> ExitCode:
    """Say on standard error what went wrong and return its exit code; anything unforeseen is a fault of this tool."""
    code = next((code for kind, code in _CODES.items() if isinstance(fault, kind)), ExitCode.OWN_FAULT)
    if code is ExitCode.READER_LEFT or code is ExitCode.INTERRUPTED:
        return code
    if isinstance(fault, GcodetoolError):
        say(str(fault))
    elif isinstance(fault, OSError):
        say(f"cannot read or write {fault.filename or 'a stream'}: {fault.strerror or fault}")
    else:
        say("".join(traceback.format_exception(fault)).rstrip())
        say("this is a fault of gcodetool; do not run what it has written")
    return code


@contextlib.contextmanager
def _told() -> Iterator[None]:
    try:
        yield
    except (GcodetoolError, OSError, KeyboardInterrupt) as fault:
        raise typer.Exit(tell(fault)) from fault


class Verbs(TyperGroup):
    """All verbs; their errors end here."""

    def parse_args(self, ctx: Any, args: list[str]) -> list[str]:
        """Without a verb the help goes to standard error, whose reader is a person."""
        if not args and not ctx.resilient_parsing:
            typer.echo(ctx.get_help(), err=True)
            raise typer.Exit(ExitCode.USAGE)
        return list(super().parse_args(ctx, args))

    def make_context(self, *args: Any, **options: Any) -> Any:
        """Read the command line; help and version are printed in here."""
        with _told():
            return super().make_context(*args, **options)

    def invoke(self, ctx: Any) -> Any:
        """Run a verb.  Every error raised on purpose, and every other one, becomes a message and an exit code."""
        with _told():
            result = super().invoke(ctx)
            flush_standard_output()
            return result


app = typer.Typer(
    cls=Verbs,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    pretty_exceptions_show_locals=False,
    context_settings={"help_option_names": ["-h", "--help"]},
)
app.command("compensate")(compensate.command)
app.command("verify")(verify.command)
app.command("reversals")(reversals.command)
app.command("audit")(audit.command)
app.add_typer(machine_sheet.app, name="machine")
app.add_typer(measure.app, name="measure")


def _print_version(wanted: bool) -> None:
    if wanted:
        typer.echo(__version__)
        raise typer.Exit


@app.callback()
def gcodetool(
    version: Annotated[
        bool, typer.Option("--version", callback=_print_version, is_eager=True, help="Print the version and exit.")
    ] = False,
) -> None:
    """Rewrite a G-code program so that a machine with backlash cuts the intended part, and prove it."""


def main() -> None:
    """Run the command line and end the process with its exit code."""
    with contextlib.suppress(ValueError):  # not the main thread
        signal.signal(signal.SIGTERM, _terminated)
    sys.exit(_run())


def _run() -> int | str | None:
    code: int | str | None
    try:
        app()
        code = ExitCode.DONE
    except SystemExit as done:
        code = done.code
    except Exception as fault:
        code = tell(fault)
    try:
        flush_standard_output()  # help and version are printed outside of the verbs
    except GcodetoolError as fault:
        code = code or tell(fault)
    return code


def _terminated(_signal: int, _frame: object) -> None:
    """Leave in order, so that temporary files go."""
    raise SystemExit(ExitCode.TERMINATED)
