"""All benchmarks by one command, ratios of medians of one run:

python tests/benchmarks/run.py [--quick] [--case NAME] [--part NAME] [--tolerance EV]
"""

import os
import sys
from pathlib import Path


def main():
    for library in ("OPENBLAS", "MKL", "OMP"):
        os.environ[f"{library}_NUM_THREADS"] = "1"  # before numpy is imported
    tests = Path(__file__).resolve().parents[1]
    sys.path[:0] = [str(tests), str(tests.parent / "src")]
    from benchmarks import figures

    return figures.main()


if __name__ == "__main__":
    sys.exit(main())
