"""Three invented designs for an ammonia monitor, side by side, and what moves the best line.

Run from anywhere: python demo/ammonia.py
"""

from pathlib import Path

import bandwright as bw

HERE = Path(__file__).parent

designs = [
    bw.read_stack(HERE / name)
    for name in ("detector-well.toml", "graded-well.toml", "emitter-period.toml")
]
print(bw.compare(designs).T.to_string())

detector = bw.solve(designs[0], tolerance="1e-9 eV")
print()
print(detector.lines().error_budget().to_string())
