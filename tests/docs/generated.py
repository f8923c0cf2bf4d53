"""What the documentation takes from the product: the help of every command, the code table, refusals."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from typing import Any

import typer.main

from gcodetool.cli.app import app
from gcodetool.errors import Refusal
from gcodetool.lash.compensate import Compensator
from gcodetool.lash.running import Settings
from gcodetool.machine import machine_from_options
from gcodetool.motion.dialect import G_CODES, M_CODES, Code
from gcodetool.program.blocks import blocks_of
from tests.docs.samples import REFUSED

COMPLETION = ("--install-completion", "--show-completion")


def commands() -> Iterator[tuple[str, Any]]:
    """Every command and command group with its full name, the root first."""
    yield from _below("gcodetool", typer.main.get_command(app))


def _below(name: str, command: Any) -> Iterator[tuple[str, Any]]:
    yield name, command
    for word, inner in getattr(command, "commands", {}).items():
        yield from _below(f"{name} {word}", inner)


def options(command: Any) -> list[Any]:
    """The options of a command, without help and completion, which all have."""
    hidden = {"--help", *COMPLETION}
    return [p for p in command.params if p.param_type_name == "option" and not hidden.intersection(p.opts)]


def _help_pages() -> str:
    return "\n".join(_help_page(name, command) for name, command in commands())


def _help_page(name: str, command: Any) -> str:
    arguments = [p for p in command.params if p.param_type_name == "argument"]
    inner = getattr(command, "commands", {})
    usage = [name, "[OPTIONS]", *(_argument(p) for p in arguments), *(["COMMAND ..."] if inner else [])]
    lines = [f"## {name}", "", "```text", " ".join(usage), "```", "", *_paragraphs(command.help), ""]
    if inner:
        lines += ["| command | what it does |", "|---|---|"]
        lines += [f"| [`{word}`](#{_anchor(name, word)}) | {_first(other.help)} |" for word, other in inner.items()]
        lines.append("")
    rows = [(_argument(p).strip("[]"), p.help or "", p) for p in arguments]
    rows += [(_spelled(p), p.help or "", p) for p in options(command)]
    if rows:
        lines += ["| argument or option | what it does |", "|---|---|"]
        lines += [f"| `{_cell(spelled)}` | {_cell(text)}{_limits(p)} |" for spelled, text, p in rows]
        lines.append("")
    return "\n".join(lines)


def _argument(parameter: Any) -> str:
    name = (parameter.metavar or parameter.name.upper()).strip("[]{}")
    return name if parameter.required else f"[{name}]"


def _anchor(name: str, word: str) -> str:
    return f"{name} {word}".replace(" ", "-")


def _paragraphs(text: str | None) -> list[str]:
    return ("\n\n".join(" ".join(part.split()) for part in (text or "").split("\n\n"))).split("\n")


def _first(text: str | None) -> str:
    return _cell(_paragraphs(text)[0])


def _cell(text: str) -> str:
    return " ".join(text.split()).replace("|", "\\|")


def _spelled(parameter: Any) -> str:
    names = ", ".join([*sorted(parameter.opts, key=len), *parameter.secondary_opts])
    takes = "" if parameter.is_flag else f" {parameter.metavar or parameter.name.upper()}"
    return names + takes


def _limits(parameter: Any) -> str:
    """Default and range, where the help text would not tell."""
    parts = []
    ranged = parameter if hasattr(parameter, "min") else getattr(parameter, "type", None)
    low, high = getattr(ranged, "min", None), getattr(ranged, "max", None)
    if low is not None or high is not None:
        parts.append(f"from {low:g}" if high is None else f"{low:g} to {high:g}")
    default = parameter.default
    if isinstance(default, str | int | float) and not isinstance(default, bool):
        parts.append(f"default `{default}`")
    return f" ({', '.join(parts)})" if parts else ""


def _code_rows(codes: Iterable[Code]) -> str:
    return "".join(f"| {_words(same)} | {same[0].group} | {_cell(same[0].effect)} |\n" for same in _alike(codes))


def _alike(codes: Iterable[Code]) -> list[list[Code]]:
    """Neighbouring rows that say the same, together."""
    found: list[list[Code]] = []
    for code in codes:
        last = found[-1][0] if found else None
        if last is not None and (last.group, last.effect, last.reason) == (code.group, code.effect, code.reason):
            found[-1].append(code)
        else:
            found.append([code])
    return found


def _words(codes: Iterable[Code]) -> str:
    return " ".join(f"`{code.word}`" for code in codes)


def _known(table: dict[str, Code]) -> str:
    head = "| word | group | what it does to the rewriter |\n|---|---|---|\n"
    return head + _code_rows(code for code in table.values() if not code.reason)


def _refused() -> str:
    head = "| word | why it is refused | way out |\n|---|---|---|\n"
    codes = [code for code in (*G_CODES.values(), *M_CODES.values()) if code.reason]
    return head + "".join(f"| {_words(same)} | {same[0].reason} | {same[0].way_out} |\n" for same in _alike(codes))


def refusal_of(program: str) -> Refusal:
    """The refusal that a program gets on a machine with lash on X, Y and Z; AssertionError where it is not refused."""
    machine = machine_from_options(lash=["x=0.1", "y=0.1", "z=0.1", "a=0.1"])
    try:
        Compensator(machine, Settings(), lambda text: None, "", False).rewrite(blocks_of(program.encode()))
    except Refusal as refusal:
        return refusal
    raise AssertionError(f"not refused: {program!r}")


def _other_refusals() -> str:
    head = "| what | example | what is said | way out |\n|---|---|---|---|\n"
    rows = []
    for what, program in REFUSED:
        refusal = refusal_of(program)
        line = program.splitlines()[refusal.line - 1]
        rows.append(f"| {what} | `{_cell(line)}` | {_cell(refusal.reason)} | {_cell(refusal.way_out)} |\n")
    return head + "".join(rows)


MAKERS: dict[str, Callable[[], str]] = {
    "help pages": _help_pages,
    "g words": lambda: _known(G_CODES),
    "m words": lambda: _known(M_CODES),
    "refused words": _refused,
    "other refusals": _other_refusals,
}
