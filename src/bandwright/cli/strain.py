"""``bandwright strain``."""

from __future__ import annotations

import argparse

from .words import FORMATS, STACK_HELP, Answer, Parser, output_options, stack_of, stack_options


def options(parser: Parser) -> None:
    """Add the arguments and options of the command."""
    parser.add_argument("stack", metavar="STACK", help=STACK_HELP)
    stack_options(parser)
    group = parser.add_argument_group("what is asked")
    group.add_argument(
        "--balance", metavar="NAME", action="append", default=[],
        help="thickness or composition to change until the mean stress is zero,"
        " 'barrier.thickness'; may be repeated, each alone",
    )  # fmt: skip
    output_options(parser, (*FORMATS, "markdown", "html"))


def run(args: argparse.Namespace) -> Answer:
    """Return the mismatch, stress and critical thickness of a stack's layers."""
    from ..mismatch import mismatches
    from ..report import data, strained
    from ..report.html import html_page
    from ..report.text import sheet

    found = mismatches(stack_of(args.stack, args))
    balances = [found.balanced(name) for name in args.balance]
    if args.format == "text":
        return Answer(strained.mismatch_text(found, balances))
    if args.format == "markdown":
        return Answer(strained.mismatch_markdown(found, balances))
    if args.format == "html":
        return Answer(html_page("Strain", strained.mismatch_html(found, balances)))
    beside = sheet(strained.mismatch_notes(found, balances))
    if args.format == "csv":
        return Answer(data.csv_text(data.columns_of(found.table)), beside)
    return Answer(data.json_text(strained.mismatch_object(found, balances)), beside)
