"""What a rewriting did: counts and the places that matter, for the summary; bounded in memory."""

from __future__ import annotations

import heapq
from collections import Counter
from dataclasses import dataclass, field
from typing import NamedTuple

_WORST = 5


class TakeUp(NamedTuple):
    """One take-up block: seconds that it takes (0 where its feed is not known), line, axes, in the cut or not."""

    seconds: float
    line: int
    axes: str
    in_cut: bool


@dataclass(slots=True)
class Tally:
    """Running totals of one rewriting; lengths in mm (degrees of rotary axes are not added), ``seconds`` of take-ups.

    ``stops`` keeps every take-up in the cut where ``keep_stops`` asks for it; otherwise only the worst few are kept.
    """

    blocks: int = 0
    changed: int = 0
    take_ups: Counter[str] = field(default_factory=Counter)
    blocks_in_cut: int = 0
    blocks_in_air: int = 0
    settles: int = 0
    splits: int = 0
    approaches: int = 0
    seconds: float = 0.0
    path_added: float = 0.0
    worst: list[TakeUp] = field(default_factory=list)
    keep_stops: bool = False
    stops: list[TakeUp] = field(default_factory=list)
    cautions: dict[str, int] = field(default_factory=dict)

    def take_up(self, made: TakeUp, length: float) -> None:
        """Count one take-up block and keep it if it is among the worst: those that stand longest in the cut."""
        self.take_ups.update(made.axes)
        self.path_added += length
        self.seconds += made.seconds
        if made.in_cut:
            self.blocks_in_cut += 1
            if self.keep_stops:
                self.stops.append(made)
            if len(self.worst) < _WORST:
                heapq.heappush(self.worst, made)
            elif made > self.worst[0]:
                heapq.heapreplace(self.worst, made)
        else:
            self.blocks_in_air += 1

    def caution(self, text: str, line: int) -> None:
        """Keep a caution once, with the first line that gave it."""
        self.cautions.setdefault(text, line)
