"""Deletable blocks: what is still known when a block may or may not have been run.

With the switch in an unknown position a block that begins with ``/`` leaves two possible states.  What both agree on
stays known.  An axis on which they differ is unknown, and is settled by its next rapid; a mode on which they differ
must be stated again before it is used.
"""

from __future__ import annotations

from dataclasses import fields, replace
from typing import NamedTuple

from gcodetool.lash.running import Running
from gcodetool.motion.command import Command, Kind
from gcodetool.motion.modal import ModalState

_WAY_OUT = "State the mode again on a line without the slash, or say --block-delete on or off"
_NEEDED = ("units", "distance", "motion", "feed_mode")
_NEEDED_ON_ARCS = ("plane", "centre")


class _Axis(NamedTuple):
    position: int
    extreme: int
    framed: bool
    side: int
    shift: int | None


class Snapshot(NamedTuple):
    """State before a deletable block."""

    state: ModalState
    feed: str | None
    axes: dict[str, _Axis]


class Doubt:
    """The modes that are in doubt; ``fields`` holds their names."""

    def __init__(self, run: Running) -> None:
        """Nothing is in doubt at the start."""
        self._run = run
        self.fields: set[str] = set()

    def check(self, command: Command) -> None:
        """Clear what the block states; raise Refusal where it needs a mode that is in doubt."""
        stated = {name for name, _ in command.g.sets} | ({"feed"} if command.has("F") else set())
        if not command.deletable:
            self.fields -= stated
        if command.kind is Kind.NONE:
            return
        needed = [*_NEEDED, *(_NEEDED_ON_ARCS if command.kind is Kind.ARC else ())]
        needed += ["feed"] if self._run.machine.take_up_feed is not None and command.kind is not Kind.RAPID else []
        for name in needed:
            if name in self.fields and name not in stated:
                reason = f"its {name.replace('_', ' ')} would hang on a deletable block before it"
                raise command.refusal(command.block.text.strip()[:40], reason, _WAY_OUT)

    def snapshot(self) -> Snapshot:
        """What is known now."""
        axes = {
            letter: _Axis(axis.position, axis.extreme, axis.framed, axis.side, axis.shift)
            for letter, axis in self._run.axes.items()
        }
        return Snapshot(self._run.state, self._run.feed, axes)

    def merge(self, before: Snapshot) -> None:
        """After a deletable block: keep what it has not changed."""
        after = self._run.state
        changed = {f.name for f in fields(ModalState) if getattr(after, f.name) != getattr(before.state, f.name)}
        if "offset" in changed:
            # stated again it may be a change of frame or none
            changed.discard("offset")
            self._run.state = replace(after, offset=None)
        self.fields |= changed
        if self._run.feed != before.feed:
            self.fields.add("feed")
        for letter, old in before.axes.items():
            axis = self._run.axes[letter]
            if axis.position != old.position or axis.framed != old.framed:
                axis.framed = False
            if axis.side != old.side or axis.extreme != old.extreme:
                axis.side = axis.side if axis.side == old.side and axis.framed else 0
            if axis.shift != old.shift:
                axis.shift = None
