"""Invented wells as functions that other processes can import, and a run that can be killed.

``python -m sweeps.wells RESULTS LOG WORKERS`` sweeps slowly and notes in LOG every stack it makes.
"""

import os
import sys
import time
from pathlib import Path

import bandwright as bw

COUNT, CHUNK = 240, 12
OVER = {"width_nm": f"4..10 count {COUNT}"}


def well(width, x=0.3, wall="20 nm"):
    """A well of some width [nm] between walls of AlGaAs."""
    barrier = bw.Layer(wall, "AlxGa1-xAs", x=x)
    return bw.Stack([barrier, bw.Layer(f"{width} nm", "GaAs", label="well"), barrier],
                    substrate="GaAs", zero="GaAs")  # fmt: skip


def fragile(width):
    """Raises for the middle of the range."""
    if 6.0 < width < 8.0:
        raise ValueError(f"no well of\n{width} nm today")
    return well(width)


class Noted:
    """A well, each call of which waits a little and adds (process, width) to a file."""

    def __init__(self, log):
        self.log = str(log)

    def __call__(self, width_nm):
        time.sleep(0.002)
        with open(self.log, "a", encoding="utf-8") as file:
            file.write(f"{os.getpid()} {width_nm!r}\n")
        return well(width_nm)

    def __repr__(self):
        return "Noted()"


def made(log):
    """Return the (process, width) of every call noted so far; the last line may be torn."""
    text = Path(log).read_text(encoding="utf-8")
    lines = text[: text.rfind("\n") + 1].splitlines()
    return [(int(line.split()[0]), float(line.split()[1])) for line in lines]


def run(results, log, workers, **arguments):
    """Sweep over the widths."""
    return bw.sweep(Noted(log), OVER, results=results, workers=int(workers), chunk=CHUNK,
                    **arguments)  # fmt: skip


if __name__ == "__main__":
    run(*sys.argv[1:4])
