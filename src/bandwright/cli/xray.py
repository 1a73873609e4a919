"""``bandwright xray``."""

from __future__ import annotations

import argparse

from .words import FORMATS, STACK_HELP, Answer, Parser, output_options, stack_of, stack_options


def options(parser: Parser) -> None:
    """Add the arguments and options of the command."""
    parser.add_argument("stack", metavar="STACK", help=STACK_HELP)
    stack_options(parser)
    group = parser.add_argument_group("the X-rays")
    group.add_argument(
        "--reflection", metavar="HKL", default="004", help="004 if not given; '1 1 5'"
    )
    group.add_argument(
        "--wavelength", metavar="LENGTH", default="Cu K-alpha1",
        help="a length, 'Cu K-alpha1' (if not given) or 'Mo K-alpha1'",
    )  # fmt: skip
    group.add_argument(
        "--orders", metavar="N", type=int, default=3, help="satellites on each side, 3"
    )
    output_options(parser, (*FORMATS, "markdown", "html"))


def run(args: argparse.Namespace) -> Answer:
    """Return where X-ray diffraction will find a stack."""
    from ..report import data, strained
    from ..report.html import html_page
    from ..report.text import sheet
    from ..xray import xray_pattern

    stack = stack_of(args.stack, args)
    pattern = xray_pattern(stack, args.reflection, args.wavelength, orders=args.orders)
    if args.format == "text":
        return Answer(strained.xray_text(pattern))
    if args.format == "markdown":
        return Answer(strained.xray_markdown(pattern))
    if args.format == "html":
        return Answer(html_page("X-ray positions", strained.xray_html(pattern)))
    facts = strained.xray_facts(pattern)[3:]
    beside = sheet([*facts, *strained.xray_notes(pattern)])
    if args.format == "csv":
        return Answer(data.csv_text(data.columns_of(pattern.table)), beside)
    return Answer(data.json_text(strained.xray_object(pattern)), beside)
