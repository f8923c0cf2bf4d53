"""Text and tables on standard output: drawn on a terminal, plain where they are piped."""

from __future__ import annotations

import sys
from collections.abc import Sequence

from gcodetool.cli.streams import standard_output
from gcodetool.cli.terminal import printable


def show(*lines: str) -> None:
    """Lines of text on standard output.  Raises ReaderLeft or WriteFailed, as ``show_table`` does."""
    _write("".join(f"{printable(line).rstrip()}\n" for line in lines))


def show_table(title: str, columns: Sequence[str], rows: Sequence[Sequence[str]]) -> None:
    """A table under its title; where it is piped, aligned columns without lines or colour, never cut or wrapped."""
    if sys.stdout is not None and sys.stdout.isatty():
        _write(_drawn(title, columns, rows))
    else:
        show(title, *_aligned([columns, *rows]))


def _aligned(rows: Sequence[Sequence[str]]) -> list[str]:
    widths = [max(map(len, column)) for column in zip(*rows, strict=True)]
    return ["  ".join(f"{cell:{width}}" for cell, width in zip(row, widths, strict=True)) for row in rows]


def _drawn(title: str, columns: Sequence[str], rows: Sequence[Sequence[str]]) -> str:
    from rich.console import Console
    from rich.table import Table
    from rich.text import Text

    table = Table(*columns, title=Text(printable(title)), title_justify="left")
    for row in rows:
        table.add_row(*(Text(printable(cell)) for cell in row))
    console = Console()
    with console.capture() as picture:
        console.print(table)
    return picture.get()


def _write(text: str) -> None:
    """Characters that the encoding of standard output lacks are escaped."""
    output = standard_output()
    output.write(text.encode(sys.stdout.encoding or "utf-8", "backslashreplace"))
    output.flush()
