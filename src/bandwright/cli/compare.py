"""``bandwright compare``."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from .words import (
    STACK_HELP,
    Answer,
    Parser,
    output_options,
    solve_arguments,
    solve_options,
    stack_of,
    stack_options,
)

if TYPE_CHECKING:
    from ..metrics import Solved
    from ..stack import Stack


def options(parser: Parser) -> None:
    """Add the arguments and options of the command."""
    parser.add_argument("stacks", metavar="STACK", nargs="+", help=STACK_HELP)
    stack_options(parser)
    solve_options(parser)
    output_options(parser)


def run(args: argparse.Namespace) -> Answer:
    """Solve several stacks and return one row for each."""
    from ..comparison import DEFAULT, compare
    from ..metrics import choose
    from ..report import data, text

    stacks = [stack_of(each, args) for each in args.stacks]
    said: dict[Stack, tuple[str, ...]] = {}

    def heard(solved: Solved) -> None:
        said[solved.stack] = solved.levels.cautions

    metrics = {**choose(None, DEFAULT), "heard": heard}
    table = compare(stacks, metrics, **solve_arguments(args)).drop(columns="heard")
    columns = data.columns_of(table)
    cautions = [said.get(stack, ()) for stack in stacks]
    if args.format == "text":
        return Answer(text.compare_text(stacks, columns, cautions))
    beside = text.designs_cautions(cautions)
    if args.format == "csv":
        return Answer(data.csv_text(columns), beside)
    rows = [{**row, "cautions": list(texts)}
            for row, texts in zip(data.rows_of(columns), cautions, strict=True)]  # fmt: skip
    return Answer(data.json_text({"designs": rows}), beside)
