"""A progress bar on a terminal: the only module that knows tqdm."""

from __future__ import annotations

import sys
from typing import Any, Self


class Progress:
    """How many designs have their row; shown if asked and if standard error is a terminal.

    Parameters
    ----------
    size, done : int
        Number of designs, and of those that were recorded before.
    shown : bool
    """

    def __init__(self, size: int, done: int, shown: bool) -> None:
        self._bar: Any = None
        if shown and sys.stderr is not None and sys.stderr.isatty() and done < size:
            from tqdm import tqdm

            # what is over within half a second needs no bar
            self._bar = tqdm(total=size, initial=done, unit=" designs", delay=0.5, smoothing=0.1,
                             file=sys.stderr, dynamic_ncols=True, leave=False)  # fmt: skip

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *_: object) -> None:
        if self._bar is not None:
            self._bar.close()

    def forward(self, designs: int) -> None:
        """Count more designs."""
        if self._bar is not None:
            self._bar.update(designs)
