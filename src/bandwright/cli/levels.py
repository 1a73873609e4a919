"""``bandwright levels``."""

from __future__ import annotations

import argparse

from .words import (
    STACK_HELP,
    Answer,
    Parser,
    levels_of,
    output_options,
    solve_options,
    stack_options,
)


def options(parser: Parser) -> None:
    """Add the arguments and options of the command."""
    parser.add_argument("stack", metavar="STACK", help=STACK_HELP)
    stack_options(parser)
    solve_options(parser)
    output_options(parser)


def run(args: argparse.Namespace) -> Answer:
    """Solve a stack and return its levels."""
    from ..report import data, text

    levels = levels_of(args)
    if args.format == "text":
        return Answer(text.levels_text(levels))
    beside = text.cautions_text(levels.cautions)
    if args.format == "csv":
        return Answer(data.csv_text(data.columns_of(levels.table)), beside)
    return Answer(data.json_text(data.levels_object(levels)), beside)
