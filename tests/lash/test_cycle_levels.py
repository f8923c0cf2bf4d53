"""Where a cycle comes back to, where controllers differ about it."""

from __future__ import annotations

from decimal import Decimal

from gcodetool.lash.compensate import Compensator
from gcodetool.lash.running import Settings
from gcodetool.machine import Axis, Machine
from gcodetool.program.blocks import blocks_of

HEAD = "G21 G90 G17\nG0 Z25\nG0 X0 Y0\n"
SETTLED = "G21 G90 G17\nG0 Z25.6000\nG0 Z25.0000\nG0 X0 Y0\n"


def rewritten(program: str) -> str:
    out: list[str] = []
    machine = Machine(axes={"Z": Axis("Z", Decimal("0.1"))})
    Compensator(machine, Settings(), out.append).rewrite(blocks_of(program.encode()))
    return "".join(out)


def test_g98_after_g99_leaves_the_level_in_doubt_so_the_next_rapid_settles() -> None:
    """NISTIR 6556 takes the level before the hole, many controllers that before the series.

    The latter is common practice, no source.
    """
    body = "G99 G81 X0 Y0 Z-1 R2 F100\nG98 X10\nG80\n"
    assert rewritten(f"{HEAD}{body}G0 Z5\n") == f"{SETTLED}{body}G0 Z5.6000\nG0 Z5.0000\n"


def test_g98_alone_is_in_no_doubt() -> None:
    body = "G98 G81 X0 Y0 Z-1 R2 F100\nX10\nG80\n"
    assert rewritten(f"{HEAD}{body}G0 Z30\n") == f"{SETTLED}{body}G0 Z30.1000\n"
