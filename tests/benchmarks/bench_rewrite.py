"""How fast the rewriter is, as ratios to floors measured in the same run: ``python -m tests.benchmarks.bench_rewrite``.

Floors on the same lines: a plain copy loop, and ``findall`` of a word pattern with a float for each number.  Inputs are
made here: short moves of a relief in three axes, and pockets with arcs, line numbers, comments.  Nothing is asserted.
"""

from __future__ import annotations

import math
import random
import re
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from decimal import Decimal

from gcodetool.lash.compensate import Compensator
from gcodetool.lash.running import Settings
from gcodetool.machine import Axis, Machine
from gcodetool.program.blocks import blocks

ROUNDS = 5
WORD = re.compile(rb"([A-Za-z])([-+]?(?:\d+\.?\d*|\.\d+))")
MACHINE = Machine(axes={a: Axis(a, Decimal(b)) for a, b in (("X", "0.12"), ("Y", "0.09"), ("Z", "0.04"))})


def relief(lines: int) -> list[bytes]:
    """Rows of short straight moves over a wavy surface, four decimals, an axis turning about every fifteenth line."""
    rng = random.Random(1)
    head = [b"G21 G90 G17\n", b"G0 Z5.0000\n", b"G0 X0.0000 Y0.0000\n", b"G1 Z0.0000 F400\n"]
    x, way, row = 0.0, 1, 0.0
    for _ in range(lines):
        x += way * (0.1 + 0.2 * rng.random())
        if not 0.0 < x < 90.0:
            way, row, x = -way, row + 0.3, min(max(x, 0.0), 90.0)
        z = math.sin(x / 9.0) * math.cos(row / 7.0) * 4.0
        head.append(f"X{x:.4f} Y{row:.4f} Z{z:.4f}\n".encode())
    return head


def pockets(lines: int) -> list[bytes]:
    """Rounded rectangles with arcs of a quarter turn, one line in three; numbered, with comments."""
    rng = random.Random(2)
    made = [b"N1 G21 G90 G17\n", b"N2 G0 Z5.000\n"]
    while len(made) < lines:
        x, y, w, h, r = (round(rng.uniform(*span), 3) for span in ((0, 200), (0, 200), (20, 60), (20, 60), (1, 8)))
        loop = [
            f"(POCKET {len(made)})", f"G0 X{x + r:.3f} Y{y:.3f}", "G1 Z-1.000 F120", f"G1 X{x + w - r:.3f} F600",
            f"G3 X{x + w:.3f} Y{y + r:.3f} I0.000 J{r:.3f}", f"G1 Y{y + h - r:.3f}",
            f"G3 X{x + w - r:.3f} Y{y + h:.3f} I{-r:.3f} J0.000", f"G1 X{x + r:.3f}",
            f"G3 X{x:.3f} Y{y + h - r:.3f} I0.000 J{-r:.3f}", f"G1 Y{y + r:.3f}",
            f"G3 X{x + r:.3f} Y{y:.3f} I{r:.3f} J0.000", "G0 Z5.000",
        ]  # fmt: skip
        made += [f"N{len(made) + k + 1} {text}\n".encode() for k, text in enumerate(loop)]
    return made


def copy(lines: list[bytes]) -> None:
    """Floor: pass every line on."""
    out: list[bytes] = []
    for line in lines:
        out.append(line)


def words(lines: list[bytes]) -> None:
    """Floor: find all words and read each number as a float."""
    find = WORD.findall
    for line in lines:
        for _, number in find(line):
            float(number)


def rewrite(lines: list[bytes]) -> None:
    """The rewriter without the proof."""
    out: list[str] = []
    Compensator(MACHINE, Settings(), out.append).rewrite(blocks(lines))


def seconds(work: Callable[[list[bytes]], None], lines: list[bytes]) -> float:
    """CPU seconds of one run."""
    start = time.process_time()
    work(lines)
    return time.process_time() - start


def ratios(name: str, lines: list[bytes]) -> Iterator[str]:
    """One line of the report per floor; runs are interleaved and the least of each counts."""
    runs = [[seconds(work, lines) for work in (copy, words, rewrite)] for _ in range(ROUNDS)]
    copied, found, rewritten = (min(column) for column in zip(*runs, strict=True))
    each = rewritten / len(lines) * 1e6
    yield f"{name}: {len(lines)} lines, {each:.2f} us a line, {rewritten / found:.1f} x findall and float"
    yield f"{name}: {rewritten / copied:.0f} x a copy loop"


# a process that prints its own peak: what the parent sees of it would include the parent's memory at the fork
CHILD = """
import re, sys
from gcodetool.cli.app import main
sys.argv[1:] = "compensate --live -q --lash x=0.1 --lash y=0.1".split()
try:
    main()
finally:
    peak = re.search(r"VmHWM:\\s+(\\d+)", open("/proc/self/status").read())[1]
    print("peak", peak, file=sys.stderr)
"""


def live_memory(lines: list[bytes]) -> str:
    """Peak memory of a live run in a process of its own (Linux)."""
    done = subprocess.run([sys.executable, "-c", CHILD], input=b"".join(lines), capture_output=True, check=True)
    peak = int(done.stderr.split()[-1]) / 1024
    return f"live, {len(lines)} lines: peak memory {peak:.0f} MB"


def main() -> None:
    """Print the report."""
    print(live_memory(relief(20_000)))
    print(live_memory(relief(200_000)))
    for name, lines in (("relief", relief(100_000)), ("pockets", pockets(50_000))):
        print(*ratios(name, lines), sep="\n")


if __name__ == "__main__":
    main()
