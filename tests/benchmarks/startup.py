"""What `bandwright lines` costs on three layers, beside the bare import of what it stands on.

Whole processes side by side in one run, medians of each; fails above 1.5 times.
"""

import os
import statistics
import subprocess
import sys
import time

ROUNDS = 9
MOST = 1.5
STACK = "30 nm Al0.28Ga0.72As, 6.2 nm GaAs, 30 nm Al0.28Ga0.72As"
IMPORTS = [sys.executable, "-c", "import numpy, scipy.linalg, pint, pandas"]
# an installed copy has its bytecode, written by pip; here the first run writes it
ENVIRONMENT = {k: v for k, v in os.environ.items() if k != "PYTHONDONTWRITEBYTECODE"}
LINES = [sys.executable, "-m", "bandwright.cli", "lines", STACK]


def seconds(command):
    start = time.perf_counter()
    subprocess.run(command, check=True, capture_output=True, env=ENVIRONMENT)
    return time.perf_counter() - start


def main():
    for command in (IMPORTS, LINES):
        seconds(command)  # files into the system's cache, bytecode written
    pairs = [(seconds(IMPORTS), seconds(LINES)) for _ in range(ROUNDS)]
    imports, lines = (statistics.median(times) for times in zip(*pairs, strict=True))
    ratio = lines / imports
    print(
        f"imports {imports:.3f} s, lines {lines:.3f} s, ratio {ratio:.2f} (at most {MOST}),"
        f" medians of {ROUNDS}"
    )
    return ratio > MOST


if __name__ == "__main__":
    sys.exit(main())
