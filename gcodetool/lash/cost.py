"""What a take-up costs in time."""

from __future__ import annotations

import math


def stop_to_stop(length: float, speed: float, acceleration: float) -> float:
    """Seconds for a straight way from standstill to standstill with a trapezoidal speed.

    ``length`` in mm (degrees), ``speed`` in mm/s, ``acceleration`` in mm/s^2; 0 for an acceleration that is not
    known, which is then left out.  Long way: ``length / speed + speed / acceleration``; a way too short to reach the
    speed: ``2 sqrt(length / acceleration)`` (uniformly accelerated motion; Biagiotti and Melchiorri, Trajectory
    Planning for Automatic Machines and Robots, 2008, section 3.2, from memory).  A length or speed of 0 gives 0.
    """
    if length <= 0.0 or speed <= 0.0:
        return 0.0
    if acceleration <= 0.0:
        return length / speed
    if speed * speed >= acceleration * length:
        return 2.0 * math.sqrt(length / acceleration)
    return length / speed + speed / acceleration
