"""Concrete machines for the proofs: arbitrary values for what neither the program nor the operator says."""

from __future__ import annotations

import random

from gcodetool.lash.running import Settings
from gcodetool.machine import Machine
from gcodetool.motion.frames import OFFSET_WORDS
from gcodetool.motion.moves import ORDER, Setup
from gcodetool.program.numbers import QUANTA_PER_MM, decimal_to_quanta


def some_setup(
    seed: int, machine: Machine, stated: Settings, first_offset: str = "G54", skip_deletable: bool = False
) -> Setup:
    """Arbitrary values for what neither program nor operator says; even seeds have a changer that moves the machine."""
    rng = random.Random(seed)
    sign = 1 if seed % 2 else -1

    def place(span: int) -> dict[str, int]:
        return {letter: sign * rng.randrange(1, span * 10_000) * (QUANTA_PER_MM // 10_000) for letter in ORDER}

    start = place(50)
    offsets = {word: place(200) | dict(stated.offsets.get(word, {})) for word in OFFSET_WORDS}
    lengths = {h: rng.randrange(1, 900_000) * (QUANTA_PER_MM // 10_000) for h in range(200)} | dict(stated.lengths)
    for letter, said in stated.start.items():
        if said.position is not None:
            start[letter] = offsets[first_offset].get(letter, 0) + decimal_to_quanta(said.position)
    if stated.start:
        # a controller that has just been set up has the frame in force in which the start was read
        offsets["G54"] = offsets[first_offset]
    return Setup(
        start=start,
        offsets=offsets,
        lengths=lengths,
        homes={"G28": place(300), "G30": place(300)},
        tool_change=place(100) if sign < 0 else None,
        units=machine.units,
        skip_deletable=skip_deletable,
    )
