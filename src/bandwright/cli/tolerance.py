"""``bandwright tolerance``."""

from __future__ import annotations

import argparse

from .words import (
    STACK_HELP,
    Answer,
    Parser,
    UsageError,
    levels_of,
    output_options,
    solve_options,
    stack_options,
)

SPREAD_HELP = (
    "standard deviation: 'every thickness=0.3 ML', 'well.thickness=0.1 nm', 'flux Al=1 %%',"
    " 'temperature=2 K'; may be repeated"
)


def options(parser: Parser) -> None:
    """Add the arguments and options of the command."""
    parser.add_argument("stack", metavar="STACK", help=STACK_HELP)
    group = parser.add_argument_group("the spreads")
    group.add_argument("--spread", metavar="NAME=AMOUNT", action="append", help=SPREAD_HELP)
    group.add_argument(
        "--window", nargs=2, metavar=("FROM", "TO"), help="wavelengths of the yield, 10um 10.6um"
    )
    group.add_argument(
        "--line", nargs=2, metavar=("UPPER", "LOWER"), help="levels of the line; the strongest if"
        " not given",
    )  # fmt: skip
    group.add_argument(
        "--draws", metavar="N", type=int, default=0, help="stacks drawn at random and solved beside"
    )
    group.add_argument("--seed", metavar="N", type=int, default=1, help="of the draws")
    stack_options(parser)
    solve_options(parser, shooting_only=True)
    output_options(parser)


def run(args: argparse.Namespace) -> Answer:
    """Solve a stack and return what its spreads do to its lines."""
    from ..report import data, tolerated
    from ..tolerances import tolerance

    spreads = named_amounts(args.spread, "--spread")
    if not spreads:
        raise UsageError("--spread is missing: what is spread, such as --spread 'every thickness="
                         "0.3 ML'")  # fmt: skip
    found = tolerance(
        levels_of(args), spreads, line=line_of(args.line), window=args.window, draws=args.draws,
        seed=args.seed,
    )  # fmt: skip
    if args.format == "text":
        return Answer(tolerated.tolerance_text(found))
    beside = tolerated.beside_text(found)
    if args.format == "csv":
        return Answer(data.csv_text(data.columns_of(found.table)), beside)
    return Answer(data.json_text(tolerated.tolerance_object(found)), beside)


def named_amounts(given: list[str] | None, option: str) -> dict[str, object]:
    """Return what ``NAME=AMOUNT`` says, by name.

    Raises
    ------
    UsageError
        If a part is missing, or a name is given twice.
    """
    found: dict[str, object] = {}
    for text in given or ():
        name, sign, amount = (part.strip() for part in text.partition("="))
        if not (name and sign and amount):
            raise UsageError(f"{option}: got {text!r}; write a name, '=', and what it is")
        if name in found:
            raise UsageError(f"{option}: {name} is given more than once")
        found[name] = amount
    return found


def line_of(ends: list[str] | None) -> tuple[int | str, int] | None:
    """Return the two ends of a line, level numbers as such.

    Raises
    ------
    UsageError
        If the lower one is no number.
    """
    if ends is None:
        return None
    upper, lower = ends
    if not (lower.isascii() and lower.isdigit()):
        raise UsageError(f"--line: got {lower!r}; the lower level is a number, from 1")
    return int(upper) if upper.isascii() and upper.isdigit() else upper, int(lower)
