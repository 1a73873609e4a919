"""The `bandwright` command: parse, call, print.

`words` holds the parser and what commands share, `door` reads the command line and prints; each
command has a module of its own, with its options and its run. Nothing that computes is imported
before a command runs, so that ``--help`` and ``--version`` answer at once.
"""

from .door import build as build
from .door import main as main
from .door import parse as parse
