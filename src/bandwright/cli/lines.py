"""``bandwright lines``."""

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
    _line_options(parser)
    output_options(parser)


def _line_options(parser: Parser) -> None:
    group = parser.add_argument_group("the lines shown")
    group.add_argument(
        "--window", nargs=2, metavar=("FROM", "TO"), help="of wavelengths, '8 um' '12 um'"
    )
    group.add_argument("--strength", metavar="F", type=float, help="least oscillator strength")
    group.add_argument("--of-box", action="store_true", help="those of the closed box as well")


def run(args: argparse.Namespace) -> Answer:
    """Solve a stack and return its lines."""
    from ..report import data, text

    lines = levels_of(args).lines(window=args.window, strength=args.strength, of_box=args.of_box)
    if args.format == "text":
        return Answer(text.lines_text(lines))
    beside = text.page(text.budget_text(lines), text.lines_notes(lines)).splitlines()
    if args.format == "csv":
        return Answer(data.csv_text(data.columns_of(lines.table)), beside)
    return Answer(data.json_text(data.lines_object(lines)), beside)
