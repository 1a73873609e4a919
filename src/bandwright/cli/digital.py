"""``bandwright digital``."""

from __future__ import annotations

import argparse

from .words import (
    FORMATS,
    STACK_HELP,
    Answer,
    Parser,
    output_options,
    solve_arguments,
    solve_options,
    stack_of,
    stack_options,
)


def options(parser: Parser) -> None:
    """Add the arguments and options of the command."""
    parser.add_argument("stack", metavar="STACK", help=STACK_HELP)
    group = parser.add_argument_group("the pulses")
    group.add_argument(
        "--layer", metavar="NAME", action="append",
        help="label, or 'layer 2'; may be repeated; every graded layer if not given, every alloy"
        " where none is graded",
    )  # fmt: skip
    group.add_argument(
        "--period", metavar="N", type=int, default=6, help="monolayers of a cell, 6 if not given"
    )
    group.add_argument(
        "--between", metavar="FORMULA", nargs=2,
        help="the two ends, 'Al0.5Ga0.5As GaAs'; a ternary's binaries if not given",
    )  # fmt: skip
    stack_options(parser)
    solve_options(parser, shooting_only=True)
    output_options(parser, (*FORMATS, "markdown", "html", "toml"))


def run(args: argparse.Namespace) -> Answer:
    """Return a stack with pulses in place of layers, and what that shifts."""
    from ..digital import digital_alloy
    from ..report import data, digitized
    from ..report.html import html_page
    from ..report.text import sheet
    from ..stackfile import dumps

    found = digital_alloy(
        stack_of(args.stack, args), args.layer, period=args.period, between=args.between,
        **solve_arguments(args),
    )  # fmt: skip
    if args.format == "text":
        return Answer(digitized.digital_text(found))
    if args.format == "markdown":
        return Answer(digitized.digital_markdown(found))
    if args.format == "html":
        return Answer(html_page("Digital alloy", digitized.digital_html(found)))
    beside = sheet(digitized.digital_notes(found))
    if args.format == "toml":
        folder = args.output.parent if args.output else "."
        return Answer(dumps(found.stack, folder), beside)
    if args.format == "csv":
        return Answer(data.csv_text(found.pulse_columns), beside)
    return Answer(data.json_text(digitized.digital_object(found)), beside)
