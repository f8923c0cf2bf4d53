"""An oracle for rewritten programs, independent of the package under test (standard library and numpy only).

In the order the data goes:

``reader``       bytes to words; strict: what cannot be read raises ``ControllerError`` (line, reason).
``arcs``         ``arc_by_centre``, ``arc_by_radius``, ``sample_arc``; an end on its start is a full circle.
``cycles``       G73, G81 to G89 as single moves (NISTIR 6556 3.5.16).
``machine``      ``Machine`` (what the program does not say), ``Motion``, ``Event``, the table of codes.
``controller``   ``run(program: bytes, machine) -> list[Motion | Event]`` in machine coordinates, mm and degrees.
``lash``         ``play_bounds(lash, datum)``, ``play(...)`` for one axis, ``flank(command, bounds, sides)``,
                 ``drive(items, bounds, actual, disturb) -> Track``: the true tool path.
``curves``       ``frechet(p, q, tolerance) -> Match``: distance of two curves walked in order.
``units``        ``split(track, start, unsure)``: feeds, settles, holes, probes and the rapids between them; says what
                 an axis of unknown side is allowed.
``compare``      ``deviation(original, result, lash, machine, *, datum, sides, known, tolerance, settle, approach,
                 allow_mismatch, disturb) -> Report``; ``Report.ok(tolerance)``, ``.feed``, ``.per_axis``,
                 ``.rapid_end``, ``.stray``, ``.stray_excess``, ``.dip``, ``.mismatch_growth``, ``.faults``;
                 ``compare_tracks`` for tracks made elsewhere.
``machines``     ``random_machine(rng, inch=, delete_blocks=)``, ``random_sides(rng)``, and the usual way in:
                 ``worst_of(original, result, lash, *, datum, inch, seeds, delete, tolerance, settle, approach,
                 allow_mismatch) -> Report``: several random machines, start states and tool changers.
``programs``     ``random_program(rng, "basic" | "full", operations=, inch=, state_units=, refusable=, deletes=,
                 dialect=) -> bytes``.
``equivalents``  ``equivalents(rng) -> dict``: one set of moves in mm and inch, G90 and G91.

Lash and datum are mappings from axis letter to mm (degrees) and to ``+`` or ``-``.  ``rng`` is ``random.Random`` for
programs and ``numpy.random.Generator`` for machines.

Command line: ``python -m tests.oracle ORIGINAL RESULT --lash x=0.12 --lash y=0.09 [--datum x=+] [--units in]
[--seeds N] [--block-delete on|off|both] [--allow-mismatch]``; prints the worst of each error, exit code 1 when the
result is wrong.

Not judged: the place of M words finer than "which feed ran under which state", pecks between R and the bottom of a
cycle, a feed on the drilling axis alone to where a cycle left it, accelerations, and text.
"""
