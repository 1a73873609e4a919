"""``bandwright picture``."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from .words import STACK_HELP, Answer, Parser, UsageError, levels_of, solve_options, stack_options

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from ..levels import Levels

SHOWN = ("bands", "budget")


def options(parser: Parser) -> None:
    """Add the arguments and options of the command."""
    told = "; or a table (FILE.csv) of a sweep or an error budget"
    parser.add_argument("stack", metavar="STACK", help=STACK_HELP + told)
    stack_options(parser)
    solve_options(parser)
    group = parser.add_argument_group("the picture")
    # not called output: what commands print is text, and this file is not
    group.add_argument(
        "--output", metavar="FILE", dest="picture", type=Path, required=True, help=".png or .svg"
    )
    group.add_argument(
        "--show", choices=SHOWN,
        help="bands, if not given: edges, levels, states; budget: what moves the strongest line",
    )  # fmt: skip
    group.add_argument("--width", metavar="LENGTH", default="85 mm", help="85 mm if not given")
    group.add_argument("--height", metavar="LENGTH", help="as what is shown needs if not given")
    group.add_argument(
        "--whole", action="store_true", help="outer layers in full, not as far as states reach"
    )
    group = parser.add_argument_group("the picture of a sweep's table")
    group.add_argument(
        "--over", metavar="COLUMN", action="append", help="a parameter; may be given twice"
    )
    group.add_argument(
        "--metric", metavar="COLUMN", action="append", help="what is drawn; may be repeated"
    )
    group.add_argument(
        "--kind", metavar="KIND", help="'curves' or 'map', of two parameters; as fits if not given"
    )
    parser.set_defaults(format=None, formats=("text",), output=None)


def run(args: argparse.Namespace) -> Answer:
    """Draw a stack, or a table, into a file."""
    from ..pictures import check_path, save_picture, without_screen
    from ..report import text

    check_path(args.picture)
    without_screen()
    size = {"width": args.width, "height": args.height}
    if args.stack.lower().endswith(".csv"):
        save_picture(of_table(args, size), args.picture)
        return Answer("")
    levels = levels_of(args)
    save_picture(of_stack(args, levels, size), args.picture)
    return Answer("", text.cautions_text(levels.cautions))


def of_stack(args: argparse.Namespace, levels: Levels, size: dict[str, Any]) -> Axes:
    """Return the picture of a stack."""
    from ..pictures import band_diagram, budget_bars

    for name in ("over", "metric", "kind"):
        if getattr(args, name):
            raise UsageError(f"--{name} is for a sweep's table; name a file that ends with .csv")
    if args.show != "budget":
        return band_diagram(levels, whole=args.whole, **size)
    lines = levels.lines()
    title = f"{lines.main.name}, {lines.main.wavelength_um:.4g} µm" if lines.main else ""
    return budget_bars(lines.error_budget(), title=title, **size)


def of_table(args: argparse.Namespace, size: dict[str, Any]) -> Axes:
    """Return the picture of a table."""
    from ..pictures import budget_bars, read_table, sweep_curves

    if args.show:
        raise UsageError("--show is for a stack; a table is drawn as what it is")
    table = read_table(args.stack)
    if {"what", "change"} <= set(table.columns):
        return budget_bars(table, **size)
    return sweep_curves(table, over=args.over, metrics=args.metric, kind=args.kind, **size)
