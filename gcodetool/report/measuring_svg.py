"""The two directions of a lash test as a drawing: deviations over targets, with two standard deviations as a band."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING
from xml.sax.saxutils import escape

from gcodetool.report.measuring import drawn_targets

if TYPE_CHECKING:
    from gcodetool.inspection.measure_records import Evaluation, Target

WIDTH, HEIGHT = 760, 420
LEFT, RIGHT, TOP, BOTTOM = 84, 20, 56, 56
UP, DOWN = "#0b5fa5", "#b3400a"  # blue and orange: told apart by most colour-blind eyes, and by their marks

Series = list[tuple[float, float, float]]  # position, mean, standard deviation (0 where unknown)


@dataclass(frozen=True, slots=True)
class _Frame:
    """Scales from mm to the drawing's units."""

    left: float
    right: float
    low: float
    high: float

    def x(self, position: float) -> float:
        return LEFT + (position - self.left) / (self.right - self.left) * (WIDTH - LEFT - RIGHT)

    def y(self, value: float) -> float:
        return TOP + (self.high - value) / (self.high - self.low) * (HEIGHT - TOP - BOTTOM)


def chart_svg(evaluation: Evaluation, title: str) -> str:
    """The drawing as SVG text; it needs no script, font or other file.  One target or none still draws."""
    targets = drawn_targets(evaluation)
    up = _series(targets, lambda t: (t.mean_up, t.s_up))
    down = _series(targets, lambda t: (t.mean_down, t.s_down))
    frame = _frame([*up, *down])
    parts = [*_axes(frame, evaluation), *_band(frame, up, UP), *_band(frame, down, DOWN)]
    parts += [*_line(frame, up, UP, 1), *_line(frame, down, DOWN, -1), *_legend()]
    head = (
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {WIDTH} {HEIGHT}" role="img" '
        'font-family="sans-serif" font-size="13">'
    )
    body = "\n".join(parts)
    return (
        f"{head}\n<title>{escape(title)}</title>\n"
        f'<rect width="{WIDTH}" height="{HEIGHT}" fill="#ffffff"/>\n'
        f'<text x="{LEFT}" y="22" font-size="15" font-weight="bold">{escape(title)}</text>\n{body}\n</svg>\n'
    )


def _series(targets: Sequence[Target], pick: Callable[[Target], tuple[float | None, float | None]]) -> Series:
    picked = [(target.position, *pick(target)) for target in targets]
    return [(position, mean, s or 0.0) for position, mean, s in picked if mean is not None]


def _frame(points: Series) -> _Frame:
    positions = [position for position, _, _ in points] or [0.0]
    edges = [0.0] + [mean + side * 2 * s for _, mean, s in points for side in (-1, 1)]
    across, along = max(edges) - min(edges), max(positions) - min(positions)
    room, reach = 0.08 * across or 0.001, 0.04 * along or 1.0
    return _Frame(min(positions) - reach, max(positions) + reach, min(edges) - room, max(edges) + room)


def _axes(frame: _Frame, evaluation: Evaluation) -> list[str]:
    x0, x1, y0, y1 = LEFT, WIDTH - RIGHT, HEIGHT - BOTTOM, TOP
    parts = [f'<path d="M{x0} {y1}V{y0}H{x1}" fill="none" stroke="#444444"/>']
    for value in _ticks(frame.low, frame.high):
        y, colour = frame.y(value), "#888888" if value == 0 else "#dddddd"
        parts.append(f'<path d="M{x0} {y:.1f}H{x1}" stroke="{colour}"/>')
        parts.append(f'<text x="{x0 - 8}" y="{y + 4:.1f}" text-anchor="end">{value:.4g}</text>')
    for target in evaluation.targets:
        x = frame.x(target.position)
        parts.append(f'<text x="{x:.1f}" y="{y0 + 18}" text-anchor="middle">{round(target.position, 2):g}</text>')
    unit = evaluation.unit
    measured = "deviation" if evaluation.common_zero else "deviation from each target's mean"
    middle = (y0 + y1) / 2
    parts.append(f'<text x="{(x0 + x1) / 2}" y="{HEIGHT - 12}" text-anchor="middle">target, {unit}</text>')
    turned = f'transform="rotate(-90 18 {middle})"'
    parts.append(f'<text x="18" y="{middle}" text-anchor="middle" {turned}>{measured}, {unit}</text>')
    return parts


def _ticks(low: float, high: float) -> list[float]:
    """Round numbers between the ends, four to ten of them, zero exactly zero."""
    step = 10.0**-9
    while (high - low) / step > 10:
        step *= 2 if f"{step:e}"[0] != "2" else 2.5
    first, last = round(low / step + 0.499999), round(high / step - 0.499999)
    return [round(number * step, 12) for number in range(first, last + 1)]


def _band(frame: _Frame, series: Series, colour: str) -> list[str]:
    if len(series) < 2:
        return []
    upper = [(x, mean + 2 * s) for x, mean, s in series]
    lower = [(x, mean - 2 * s) for x, mean, s in reversed(series)]
    return [f'<polygon points="{_points(frame, upper + lower)}" fill="{colour}" fill-opacity="0.15"/>']


def _line(frame: _Frame, series: Series, colour: str, side: int) -> list[str]:
    """The means, joined, each marked by a triangle that points the way of its approach."""
    means = [(x, mean) for x, mean, _ in series]
    parts = [f'<polyline points="{_points(frame, means)}" fill="none" stroke="{colour}" stroke-width="1.5"/>']
    for position, mean, s in series:
        x = frame.x(position)
        parts.append(f'<path d="M{x:.1f} {frame.y(mean - 2 * s):.1f}V{frame.y(mean + 2 * s):.1f}" stroke="{colour}"/>')
        parts.append(_triangle(x, frame.y(mean), colour, side))
    return parts


def _triangle(x: float, y: float, colour: str, side: int) -> str:
    return f'<path d="M{x + 6 * side:.1f} {y:.1f}L{x - 4 * side:.1f} {y - 5:.1f}V{y + 5:.1f}Z" fill="{colour}"/>'


def _points(frame: _Frame, points: Sequence[tuple[float, float]]) -> str:
    return " ".join(f"{frame.x(x):.1f},{frame.y(y):.1f}" for x, y in points)


def _legend() -> list[str]:
    parts = []
    for x, colour, side, text in ((LEFT, UP, 1, "up, mean and 2 s"), (LEFT + 180, DOWN, -1, "down, mean and 2 s")):
        parts.append(_triangle(x + 6, 38, colour, side))
        parts.append(f'<text x="{x + 18}" y="43" fill="{colour}">{text}</text>')
    return parts
