"""Judge a rewritten program: original on an ideal machine against result on a machine with lash, curve by curve.

Feeds must follow the intended curve in order (Frechet distance), holes must have their place and depth, every rapid
must end where it should, and what metal feels (feed, spindle, tool, coolant, times in G93, dwells, stops) must be the
same.  ``units`` says which axes may be off by their lash, and when.  Of a settle on a feed that moves Z alone, the
overshoot is allowed where it lies above, on the same vertical line, and never below the lower end of the original's
motion.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from tests.oracle.arcs import Array
from tests.oracle.controller import run
from tests.oracle.curves import frechet, length, stray
from tests.oracle.lash import Track, drive, play_bounds
from tests.oracle.machine import AXES, Event, Machine
from tests.oracle.units import NO_MOTION, Unit, Z, split

TOLERANCE = 0.0006
MISMATCH_GROWTH = 0.002
"""mm that the radius mismatch of an arc may grow (NISTIR 6556 3.5.3.2)."""
MOST_FAULTS = 8


@dataclass(frozen=True, slots=True)
class Finding:
    """A worst value with its line numbers in the original and the result (0: nowhere)."""

    value: float = 0.0
    original_line: int = 0
    result_line: int = 0

    def worse(self, other: Finding) -> Finding:
        """The larger of the two."""
        return other if other.value > self.value else self


@dataclass(frozen=True, slots=True)
class Report:
    """Worst errors in mm (degrees).

    ``feed``: distance of the feed paths, depth and place of holes, ends of settles; ``per_axis``: the same by axis;
    ``rapid_end``: ends of rapids and probes; ``stray``: distance of the rapid paths, ``stray_excess`` what of it is not
    allowed; ``dip``: how far a rapid or settle goes below the original's lowest point; ``mismatch_growth``: of start
    and end radius of arcs.
    """

    feed: Finding = Finding()
    per_axis: tuple[float, ...] = (0.0,) * 6
    rapid_end: Finding = Finding()
    stray: Finding = Finding()
    stray_excess: Finding = Finding()
    dip: Finding = Finding()
    mismatch_growth: Finding = Finding()
    faults: tuple[str, ...] = ()

    def ok(self, tolerance: float = TOLERANCE) -> bool:
        """True if nothing exceeds ``tolerance``, no arc grew its mismatch, and no fault was found."""
        worst = max(self.feed.value, self.rapid_end.value, self.stray_excess.value, self.dip.value)
        return worst <= tolerance and self.mismatch_growth.value <= MISMATCH_GROWTH and not self.faults

    def merge(self, other: Report) -> Report:
        """Worst of both."""
        return Report(
            self.feed.worse(other.feed),
            tuple(max(pair) for pair in zip(self.per_axis, other.per_axis, strict=True)),
            self.rapid_end.worse(other.rapid_end),
            self.stray.worse(other.stray),
            self.stray_excess.worse(other.stray_excess),
            self.dip.worse(other.dip),
            self.mismatch_growth.worse(other.mismatch_growth),
            tuple(dict.fromkeys(self.faults + other.faults))[:MOST_FAULTS],
        )


@dataclass(frozen=True, slots=True)
class Terms:
    """What a comparison needs beside the two paths: lash per axis and what is allowed; see ``deviation``."""

    lash: tuple[float, ...]
    tolerance: float = TOLERANCE
    settle: float = 0.5
    approach: float = 0.0
    allow_mismatch: bool = False
    axes: tuple[int, ...] = ()


def deviation(
    original: bytes,
    result: bytes,
    lash: Mapping[str, float],
    machine: Machine,
    *,
    datum: Mapping[str, str] | None = None,
    sides: Sequence[float] = (0.0,) * 6,
    known: str = "",
    tolerance: float = TOLERANCE,
    settle: float = 0.5,
    approach: float = 0.0,
    allow_mismatch: bool = False,
    disturb: int | None = None,
) -> Report:
    """Run ``original`` without lash and ``result`` with it on one machine, and compare.

    ``sides``: where in its play each axis starts, 0 minus flank to 1 plus flank.  ``known``: axes whose start side the
    rewriter was told.  ``settle``: overshoot allowed beyond the lash where an axis may be settled, mm; ``approach``:
    the same on every rapid (one-sided approach).  ``allow_mismatch``: subtract the radius mismatch of the original's
    arcs from the feed error (controllers differ on where they put it; here it grows evenly along the arc).
    ``disturb``: seed of the push that every axis gets at a tool change.  Raises ``ControllerError`` when either program
    is wrong on this machine.
    """
    bounds = play_bounds(lash, datum)
    unsure = frozenset(range(6)) - {AXES.index(a) for a in known.upper()}
    rng = None if disturb is None else np.random.default_rng(disturb)
    begin = tuple(c - low - s * (high - low) for c, (low, high), s in zip(machine.start, bounds, sides, strict=True))
    play = {i: pair for i, pair in enumerate(bounds) if pair != (0.0, 0.0)}
    ideal = drive(run(original, replace(machine, play={})), ((0.0, 0.0),) * 6, machine.start)
    actual = drive(run(result, replace(machine, play=play)), bounds, begin, rng)
    terms = Terms(tuple(h - low for low, h in bounds), tolerance, settle, approach, allow_mismatch)
    return compare_tracks(ideal, actual, machine.start, begin, terms, unsure)


def compare_tracks(
    ideal: Track,
    actual: Track,
    ideal_start: Sequence[float],
    actual_start: Sequence[float],
    terms: Terms,
    unsure: frozenset[int],
) -> Report:
    """Compare two true paths unit by unit; the axes in use are found here."""
    wanted = _substantial(split(ideal, ideal_start, unsure), terms.tolerance)
    got = _substantial(split(actual, actual_start, unsure), terms.tolerance)
    report = Report(faults=tuple(_event_faults(ideal, actual)))
    terms = replace(terms, axes=_axes_in_use(wanted + got))
    for p, q in zip(wanted, got, strict=False):
        if p.kind != q.kind:
            break
        report = report.merge(_compare(p, q, terms))
    else:
        if len(wanted) == len(got):
            return report
    return report.merge(_structure(wanted, got))


def _substantial(units: list[Unit], tolerance: float) -> list[Unit]:
    """Leave out feed units that nowhere leave their start by more than half the tolerance (rounding, not cutting)."""
    out: list[Unit] = []
    carry: list[Unit] = []
    for unit in units:
        if unit.kind == "feed" and np.abs(unit.points() - unit.start).max() <= tolerance / 2:
            carry.append(unit)
            continue
        if carry:
            unit.rapid = [pair for c in carry for pair in c.rapid] + unit.rapid
            carry = []
        out.append(unit)
    return out


def _structure(wanted: list[Unit], got: list[Unit]) -> Report:
    place = next((k for k, (p, q) in enumerate(zip(wanted, got, strict=False)) if p.kind != q.kind), None)
    k = min(len(wanted), len(got)) - 1 if place is None else place
    p, q = wanted[k], got[k]
    text = (
        f"{len(wanted)} stretches of motion became {len(got)}; first of another kind: "
        f"{p.kind} at line {p.last_line()} against {q.kind} at line {q.last_line()}"
    )
    return Report(feed=Finding(float("inf"), p.last_line(), q.last_line()), faults=(text,))


def _axes_in_use(units: list[Unit]) -> tuple[int, ...]:
    used = np.zeros(6, dtype=bool)
    for unit in units:
        for stroke in (*(stroke for stroke, _ in unit.rapid), *unit.strokes):
            used |= (np.abs(stroke.points - stroke.points[0]) > NO_MOTION).any(axis=0)
    return tuple(np.flatnonzero(used).tolist()) or (0,)


def _event_faults(ideal: Track, actual: Track) -> Iterator[str]:
    lists = [[e for e in track if isinstance(e, Event) and e.what != "frame"] for track in (ideal, actual)]
    for a, b in zip(*lists, strict=False):
        if (a.what, a.value) != (b.what, b.value):
            yield f"{a.what} {a.value:g} at line {a.line} became {b.what} {b.value:g} at line {b.line}"
            return
    if len(lists[0]) != len(lists[1]):
        yield f"{len(lists[0])} dwells, stops and tool changes became {len(lists[1])}"


# --- one pair of units ------------------------------------------------------------------------------------------


def _compare(p: Unit, q: Unit, terms: Terms) -> Report:
    report = _compare_rapids(p, q, terms)
    if p.kind == "end":
        return report
    handler = {"feed": _compare_feed, "hole": _compare_hole, "settle": _compare_settle, "probe": _compare_probe}
    report = report.merge(handler[p.kind](p, q, terms))
    growth = _mismatch(q) - _mismatch(p)
    return report.merge(Report(mismatch_growth=Finding(growth, p.last_line(), q.last_line())))


def _mismatch(unit: Unit) -> float:
    return max((abs(s.motion.arc.mismatch) for s in unit.strokes if s.motion.arc), default=0.0)


def _beyond(difference: Array, terms: Terms, loose: frozenset[int]) -> Array:
    """Absolute difference per axis in use, less the lash on loose axes."""
    slack = np.array([terms.lash[i] if i in loose else 0.0 for i in range(6)])
    over: Array = np.maximum(np.abs(difference) - slack, 0.0)
    return over


def _compare_rapids(p: Unit, q: Unit, terms: Terms) -> Report:
    over = _beyond(q.start - p.start, terms, p.doubt.loose)
    lines = (p.rapid_line(), q.rapid_line())
    report = Report(rapid_end=Finding(float(np.linalg.norm(over)), *lines))
    if not p.rapid and not q.rapid:
        return report
    report = report.merge(_between_rapids(p, q, terms))
    axes = list(terms.axes)
    a, b = p.rapid_points(), q.rapid_points()
    far = stray(a[:, axes], b[:, axes])
    free = p.before.unsure | p.before.lost
    margins = [max(terms.settle + terms.lash[i] if i in free else 0.0, terms.approach) for i in axes]
    allowed = float(np.linalg.norm(np.array(terms.lash)[axes] + margins))
    beyond = max(0.0, far - allowed)
    slack = terms.lash[Z] if Z in p.before.loose else 0.0
    below = float(min(a[:, Z].min(), p.start[Z]) - b[:, Z].min()) - slack
    return report.merge(
        Report(stray=Finding(far, *lines), stray_excess=Finding(beyond, *lines), dip=Finding(below, *lines))
    )


def _between_rapids(p: Unit, q: Unit, terms: Terms) -> Report:
    """Every rapid of the original must end where a rapid of the result begins or ends; G28's via point is let off."""
    report = Report()
    begin = q.rapid[0][0].points[0] if q.rapid else q.start
    stops = np.array([begin, *(stroke.points[-1] for stroke, _ in q.rapid)])
    for k, (stroke, loose) in enumerate(p.rapid[:-1]):
        following = p.rapid[k + 1][0].motion
        if following.machine_frame and following.line == stroke.motion.line:
            continue
        gaps = np.linalg.norm(_beyond(stops - stroke.points[-1], terms, loose), axis=1)
        at = int(gaps.argmin())
        line = q.rapid[max(at - 1, 0)][0].motion.line if q.rapid else 0
        report = report.merge(Report(rapid_end=Finding(float(gaps[at]), stroke.motion.line, line)))
    return report


def _compare_feed(p: Unit, q: Unit, terms: Terms) -> Report:
    a, b = p.points(), q.points()
    still = {i for i in p.doubt.loose if np.abs(a[:, i] - a[0, i]).max() <= NO_MOTION}
    soft = p.doubt.soft - p.doubt.unsure - still
    if soft and _beyond(b[0] - a[0], terms, soft).max() <= terms.tolerance:
        b = np.vstack([a[0], b])  # the way down begins lower, in air, on the same line
    axes = [i for i in terms.axes if i not in still]
    match = frechet(a[:, axes], b[:, axes], terms.tolerance)
    per_axis = [0.0] * 6
    for i, value in zip(axes, match.per_axis, strict=True):
        per_axis[i] = value
    off = float(_beyond(b[0] - a[0], terms, p.doubt.loose)[list(still)].max()) if still else 0.0
    place = p.line_at(match.first), q.line_at(match.second)
    error = match.distance - (_mismatch(p) if terms.allow_mismatch else 0.0)
    feed = Finding(error, *place).worse(Finding(off, *place))
    # lengths along the path say nothing about the feed where the path itself is wrong
    faults = tuple(_context_faults(p, q, terms)) if match.distance <= terms.tolerance else ()
    return Report(feed=feed, per_axis=tuple(per_axis), faults=faults)


def _context_faults(p: Unit, q: Unit, terms: Terms) -> Iterator[str]:
    """Feed, spindle, tool and coolant must change at the same places along the path, and G93 times must add up."""
    runs = [_contexts(unit, terms) for unit in (p, q)]
    # an axis that a cycle has left on its other flank begins its way up to its lash nearer
    soft = sum(terms.lash[axis] for axis in p.doubt.soft)
    if any(context[0] == 0.0 and context[1] != 930 for context, _, _ in runs[0]):
        return
    for (want, long, line), (have, much, there) in zip(*runs, strict=False):
        if want != have or abs(long - much) > 0.01 + 1e-3 * long + soft:
            yield f"line {line}: {want} over {long:.3f} became {have} over {much:.3f} at line {there}"
            return
    if len(runs[0]) != len(runs[1]):
        yield f"line {p.last_line()}: feed or spindle changes {len(runs[0])} became {len(runs[1])}"
    least = 2 * terms.tolerance
    times = [sum(s.motion.minutes for s in unit.strokes if length(s.points) > least) for unit in (p, q)]
    if abs(times[0] - times[1]) > 0.01 * times[0]:
        yield f"line {p.last_line()}: {times[0]:.6f} minutes in G93 became {times[1]:.6f}"


def _contexts(unit: Unit, terms: Terms) -> list[tuple[tuple[object, ...], float, int]]:
    out: list[tuple[tuple[object, ...], float, int]] = []
    for stroke in unit.strokes:
        long = length(stroke.points)
        if long <= 2 * terms.tolerance:
            continue
        context = stroke.motion.context
        if out and out[-1][0] == context:
            out[-1] = (context, out[-1][1] + long, out[-1][2])
        else:
            out.append((context, long, stroke.motion.line))
    return out


def _compare_hole(p: Unit, q: Unit, terms: Terms) -> Report:
    """Place during feeds and depth exact; the drilling axis may come out by its lash; the rest is a rapid's stray."""
    normal = p.strokes[0].motion.normal
    named = frozenset().union(*(s.motion.named for s in p.strokes))
    a, b = p.points(), q.points()
    depth = abs(float(a[:, normal].min() - b[:, normal].min()))
    cuts = [np.vstack([s.points for s in unit.strokes if s.motion.kind == "feed"]) for unit in (p, q)]
    if p.strokes[0].motion.code == 870:
        depth = max(depth, abs(float(cuts[0][:, normal].max() - cuts[1][:, normal].max())))
    over = _beyond(cuts[1] - cuts[0][0], terms, p.doubt.loose - named)
    over[:, normal] = 0.0
    aside = float(np.linalg.norm(over, axis=1).max())
    end = _beyond(b[-1] - a[-1], terms, (p.doubt.loose - named) | {normal})
    lines = (p.last_line(), q.last_line())
    per_axis = over.max(axis=0)
    per_axis[normal] = depth
    axes = list(terms.axes)
    far = stray(a[:, axes], b[:, axes])
    beyond = max(0.0, far - float(np.linalg.norm(terms.lash)))
    contexts = [{s.motion.context for s in unit.strokes if s.motion.kind == "feed"} for unit in (p, q)]
    fault = () if contexts[0] == contexts[1] else (f"line {lines[0]}: {contexts[0]} became {contexts[1]}",)
    return Report(
        feed=Finding(max(depth, aside), *lines),
        per_axis=tuple(per_axis.tolist()),
        rapid_end=Finding(float(np.linalg.norm(end)), *lines),
        stray=Finding(far, *lines),
        stray_excess=Finding(beyond, *lines),
        faults=fault,
    )


def _compare_settle(p: Unit, q: Unit, terms: Terms) -> Report:
    a, b = p.points(), q.points()
    others = [i for i in range(6) if i != Z]
    aside = float(np.abs(b[:, others] - b[0, others]).max())
    end = _beyond(b[-1] - a[-1], terms, p.doubt.loose - {Z})
    slack = terms.lash[Z] if Z in p.doubt.loose and a[0, Z] <= a[:, Z].min() + NO_MOTION else 0.0
    below = float(a[:, Z].min() - b[:, Z].min()) - slack
    above = float(b[:, Z].max() - a[:, Z].max()) - 2 * terms.lash[Z] - terms.settle
    lines = (p.last_line(), q.last_line())
    worst = max(aside, float(np.linalg.norm(end)))
    axis = [0.0] * 6
    axis[Z] = float(end[Z])
    return Report(
        feed=Finding(worst, *lines),
        per_axis=tuple(axis),
        dip=Finding(below, *lines),
        stray_excess=Finding(max(0.0, above), *lines),
    )


def _compare_probe(p: Unit, q: Unit, terms: Terms) -> Report:
    named = p.strokes[-1].motion.named
    end = _beyond(q.points()[-1] - p.points()[-1], terms, p.doubt.loose | named)
    return Report(rapid_end=Finding(float(np.linalg.norm(end)), p.last_line(), q.last_line()))
