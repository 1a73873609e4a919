"""``bandwright anticrossings``."""

from __future__ import annotations

import argparse

from .words import (
    STACK_HELP,
    Answer,
    Parser,
    UsageError,
    output_options,
    over_of,
    solve_arguments,
    solve_options,
    stack_of,
    stack_options,
)


def options(parser: Parser) -> None:
    """Add the arguments and options of the command."""
    parser.add_argument("stack", metavar="STACK", help=STACK_HELP)
    group = parser.add_argument_group("the range")
    group.add_argument(
        "--over", metavar="NAME=RANGE", action="append",
        help="one parameter: 'field=0 kV/cm..60 kV/cm' takes 31 values, add 'step 1 kV/cm' or"
        " 'count 61' for others; 'well.thickness=4nm..9nm step 0.5 nm'",
    )  # fmt: skip
    group.add_argument(
        "--of-box", action="store_true", help="those with levels of the closed box as well"
    )
    stack_options(parser)
    solve_options(parser, shooting_only=True)
    output_options(parser)


def run(args: argparse.Namespace) -> Answer:
    """Look for anticrossings along a range and return one row for each."""
    if not args.over:
        raise UsageError(
            "--over says along what, and is missing; write for example --over"
            " 'field=0 kV/cm..60 kV/cm'"
        )
    from ..crossings import anticrossings
    from ..report import crossed, data
    from ..report.text import cautions_text

    stack = stack_of(args.stack, args)
    over = over_of(args.over)
    table = anticrossings(stack, over, of_box=args.of_box, **solve_arguments(args))
    columns = data.columns_of(table)
    cautions, parameter = table.attrs["cautions"], table.attrs["parameter"]
    if args.format == "text":
        return Answer(crossed.crossed_text(stack, columns, parameter, over, cautions))
    beside = cautions_text(cautions)
    if args.format == "csv":
        return Answer(data.csv_text(columns), beside)
    whole = {
        "stack": data.stack_object(stack),
        "parameter": parameter,
        "anticrossings": data.rows_of(columns),
        "cautions": list(cautions),
    }
    return Answer(data.json_text(whole), beside)
