"""``bandwright compare``."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from .tolerance import SPREAD_HELP, line_of, named_amounts
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

if TYPE_CHECKING:
    from ..metrics import Solved
    from ..stack import Stack


def options(parser: Parser) -> None:
    """Add the arguments and options of the command."""
    parser.add_argument("stacks", metavar="STACK", nargs="+", help=STACK_HELP)
    group = parser.add_argument_group("the columns")
    group.add_argument(
        "--metric", metavar="NAME", action="append",
        help="such as wavelength_um, rounded_wavelength_um, net_strain_percent, sigma_um,"
        " yield_percent; may be repeated",
    )  # fmt: skip
    group.add_argument(
        "--wish", metavar="NAME=WISH", action="append",
        help="rank by it: 'wavelength_um=near 10.3, weight 2', 'dipole_nm=large'; may be repeated",
    )  # fmt: skip
    group.add_argument("--line", nargs=2, metavar=("UPPER", "LOWER"),
                       help="levels of the line; each design's strongest if not given")  # fmt: skip
    group.add_argument("--spread", metavar="NAME=AMOUNT", action="append", help=SPREAD_HELP)
    group.add_argument(
        "--yield-window", nargs=2, metavar=("FROM", "TO"), help="wavelengths of the yield"
    )
    stack_options(parser)
    solve_options(parser)
    output_options(parser, (*FORMATS, "markdown", "html"))


def run(args: argparse.Namespace) -> Answer:
    """Solve several stacks and return one row for each."""
    from ..comparison import compare, metrics_of
    from ..report import compared, data, text

    stacks = [stack_of(each, args) for each in args.stacks]
    said: dict[Stack, tuple[str, ...]] = {}

    def heard(solved: Solved) -> None:
        said[solved.stack] = solved.levels.cautions

    spreads = named_amounts(args.spread, "--spread") or None
    solving = solve_arguments(args)
    metrics = metrics_of(args.metric, spreads, args.yield_window, args.method)
    table = compare(
        stacks, {**metrics, "heard": heard}, line=line_of(args.line), spreads=spreads,
        yield_window=args.yield_window, wishes=named_amounts(args.wish, "--wish") or None,
        **solving,
    ).drop(columns="heard")  # fmt: skip
    columns = data.columns_of(table)
    cautions = [said.get(stack, ()) for stack in stacks]
    if args.format == "text":
        return Answer(text.compare_text(stacks, columns, cautions))
    if args.format == "markdown":
        return Answer(compared.compare_markdown(stacks, columns, cautions))
    if args.format == "html":
        return Answer(compared.compare_html(stacks, columns, cautions))
    beside = text.designs_cautions(cautions)
    if args.format == "csv":
        return Answer(data.csv_text(columns), beside)
    rows = [{**row, "cautions": list(texts)}
            for row, texts in zip(data.rows_of(columns), cautions, strict=True)]  # fmt: skip
    return Answer(data.json_text({"designs": rows}), beside)
