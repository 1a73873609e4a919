"""Where the time of one small `solve` goes, room by room."""

from __future__ import annotations

import cProfile
import pstats
from collections import defaultdict
from pathlib import Path

import bandwright as bw

SRC = Path(bw.__file__).resolve().parent


def room(file):
    """Return the room a source file lies in, with its module in the solver; None outside."""
    try:
        inside = Path(file).resolve().relative_to(SRC)
    except (ValueError, OSError):
        return None
    parts = [part.removesuffix(".py") for part in inside.parts]
    return "/".join(parts[:2]) if parts[0] == "solver" else parts[0]


def shares(case, times=200, tolerance=1e-6):
    """Return {room: (share of the time, calls a solve)}, largest first, and ms a solve.

    Time inside numpy, scipy and the interpreter's own functions counts for the room that called.
    The profiler slows calls down, so that rooms of many small calls look larger than they are.
    """
    stack, asked = case.stack, {**case.asked, "tolerance": f"{tolerance} eV"}
    profiler = cProfile.Profile()
    for turn in range(times + 3):
        if turn == 3:  # caches are filled
            profiler.enable()
        energies = bw.solve(stack, **asked).energies
    profiler.disable()
    assert len(energies)
    stats = pstats.Stats(profiler).stats
    rooms, owners = {key: room(key[0]) for key in stats}, {}

    def owner(key, seen=frozenset()):
        """Rooms on whose behalf a function runs, as shares."""
        if rooms.get(key):
            return {rooms[key]: 1.0}
        if key in owners:
            return owners[key]
        callers = {k: v[2] for k, v in stats[key][4].items() if k in stats and k not in seen}
        total = sum(callers.values()) or float(len(callers)) or 1.0
        found = defaultdict(float)
        for caller, spent in callers.items():
            part = spent / total if sum(callers.values()) else 1.0 / total
            for name, share in owner(caller, seen | {key}).items():
                found[name] += part * share
        if not callers:
            found["(outside)"] = 1.0
        if not seen:
            owners[key] = dict(found)
        return dict(found)

    spent, calls = defaultdict(float), defaultdict(int)
    for key, (_, count, own, _, _) in stats.items():
        for name, share in owner(key).items():
            spent[name] += own * share
            calls[name] += count * share
    total = sum(spent.values())
    order = sorted(spent, key=spent.get, reverse=True)
    found = {name: (spent[name] / total, calls[name] / times) for name in order}
    return found, 1e3 * total / times
