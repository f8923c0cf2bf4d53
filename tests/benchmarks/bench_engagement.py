"""Time and memory of the audit on programs of different habits: python -m tests.benchmarks.bench_engagement [MOVES]

Each program is made twice, with MOVES and with twice as many feed motions (half the given number and all of it), so
that growth shows.  Times are processor seconds of one process; peak memory is that of the process that ran the larger
program.
"""

from __future__ import annotations

import math
import resource
import subprocess
import sys
import time
from collections.abc import Callable, Iterator

HEAD = "G21 G90 G17\nS10000 M3\nF600\nG0 X0 Y0 Z5\n"


def adaptive(count: int) -> Iterator[str]:
    """Loops of 60 short lines, 3 mm wide, moving on by 0.3 mm, row after row: clearing by engagement."""
    per_loop, made, row, x = 60, 0, 0, 0.0
    yield "G1 Z-2"
    while made < count:
        for k in range(per_loop):
            angle = 2.0 * math.pi * k / per_loop
            yield f"G1 X{x + 3.0 * math.cos(angle):.4f} Y{8.0 * row + 3.0 * math.sin(angle):.4f}"
        made += per_loop
        x += 0.3
        if x > 100.0:
            x, row = 0.0, row + 1


def zigzag(count: int) -> Iterator[str]:
    """Facing in lines of 0.5 mm, 1.2 mm apart, level after level of 60 x 60 mm."""
    made, z = 0, -1.0
    while made < count:
        yield f"G1 Z{z}"
        for line in range(50):
            ends = range(1, 121) if line % 2 == 0 else range(119, -1, -1)
            for k in ends:
                yield f"G1 X{0.5 * k:.3f}"
            yield f"G1 Y{1.2 * (line + 1):.3f}"
            made += 121
        yield "G0 Z5\nG0 X0 Y0"
        z -= 0.5


def contours(count: int) -> Iterator[str]:
    """Wavy contours of 400 short lines, 40 levels of 0.2 mm each, part beside part."""
    made, part = 0, 0
    while made < count:
        for level in range(1, 41):
            for k in range(401):
                angle = 2.0 * math.pi * k / 400
                radius = 20.0 + math.sin(9 * angle)
                x, y = 60.0 * (part % 8) + radius * math.cos(angle), 60.0 * (part // 8) + radius * math.sin(angle)
                yield f"G1 X{x:.4f} Y{y:.4f}" if k else f"G0 Z5\nG0 X{x:.4f} Y{y:.4f}\nG1 Z{-0.2 * level:.2f}"
            made += 401
        part += 1


def relief(count: int) -> Iterator[str]:
    """A surface of hills in lines 0.3 mm apart, points 0.3 mm apart: every move has its own depth."""
    side = 300
    for k in range(count):
        line, place = divmod(k, side)
        column = place if line % 2 == 0 else side - 1 - place
        x, y = 0.3 * column, 0.3 * line
        yield f"G1 X{x:.3f} Y{y:.3f} Z{-2.0 + math.sin(0.2 * x) * math.cos(0.15 * y):.4f}"


def arcs(count: int) -> Iterator[str]:
    """Whole circles and half circles, growing from 1 to 20 mm by 0.5 mm, place after place, two depths."""
    made, place = 0, 0
    while made < count:
        x, y = 50.0 * (place % 10), 50.0 * (place // 10)
        for z in (-1.0, -2.0):
            yield f"G0 Z5\nG0 X{x} Y{y}\nG1 Z{z}"
            for k in range(2, 41):
                r = 0.5 * k
                yield f"G1 X{x + r:.3f} Y{y}\nG3 X{x - r:.3f} Y{y} I{-r:.3f} J0\nG3 X{x + r:.3f} Y{y} I{r:.3f} J0"
                made += 3
        place += 1


def long_lines(count: int) -> Iterator[str]:
    """Facing in single lines of 100 mm, 1.5 mm apart, level after level."""
    made, z = 0, -0.2
    while made < count:
        yield f"G1 Z{z:.2f}"
        for line in range(1, 61):
            yield f"G1 X{100 if line % 2 else 0}\nG1 Y{1.5 * line:.2f}"
            made += 2
        yield "G0 Z5\nG0 X0 Y0"
        z -= 0.2


HABITS: dict[str, tuple[Callable[[int], Iterator[str]], str]] = {
    "adaptive": (adaptive, "flat"),
    "zigzag": (zigzag, "flat"),
    "contours": (contours, "flat"),
    "relief": (relief, "flat"),
    "relief, ball": (relief, "ball"),
    "arcs": (arcs, "flat"),
    "long lines": (long_lines, "flat"),
}


def measured(habit: str, count: int) -> tuple[int, float, float]:
    """Label one program in this process: (feed motions, processor seconds, peak memory in MB)."""
    from gcodetool.inspection.audit import labels_by_line
    from gcodetool.inspection.job_records import Cutter, Job
    from gcodetool.motion.moves import Setup

    make, shape = HABITS[habit]
    program = (HEAD + "\n".join(make(count))).encode()
    start = time.process_time()
    found = labels_by_line(program, Job(cutters=(Cutter("*", 3.0, shape=shape),)), Setup(units="mm", unplaced="XYZABC"))
    spent = time.process_time() - start
    return len(found), spent, resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1000.0


def in_a_process(habit: str, count: int) -> tuple[int, float, float]:
    """The same in a process of its own, so that memory is counted alone."""
    code = f"from tests.benchmarks.bench_engagement import measured; print(*measured({habit!r}, {count}))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    moves, spent, peak = done.stdout.split()
    return int(moves), float(spent), float(peak)


def main() -> None:
    """Print one line for each habit."""
    most = int(sys.argv[1]) if len(sys.argv) > 1 else 100_000
    print(f"{'habit':14} {'moves':>8} {'s':>7} {'moves':>8} {'s':>7} {'growth':>7} {'MB':>6}")
    for habit in HABITS:
        half, whole = in_a_process(habit, most // 2), in_a_process(habit, most)
        growth = whole[1] / half[1]
        print(
            f"{habit:14} {half[0]:8} {half[1]:7.1f} {whole[0]:8} {whole[1]:7.1f} {growth:7.2f} {whole[2]:6.0f}",
            flush=True,
        )


if __name__ == "__main__":
    main()
