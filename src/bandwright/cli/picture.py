"""``bandwright picture``."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING

from .words import STACK_HELP, Answer, Parser, levels_of, solve_options, stack_options

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from ..levels import Levels

SHOWN = ("bands", "budget")


def options(parser: Parser) -> None:
    """Add the arguments and options of the command."""
    parser.add_argument("stack", metavar="STACK", help=STACK_HELP)
    stack_options(parser)
    solve_options(parser)
    group = parser.add_argument_group("the picture")
    # not called output: what commands print is text, and this file is not
    group.add_argument(
        "--output", metavar="FILE", dest="picture", type=Path, required=True, help=".png or .svg"
    )
    group.add_argument(
        "--show", choices=SHOWN, default="bands",
        help="bands: edges, levels and states; budget: what moves the strongest line",
    )  # fmt: skip
    group.add_argument("--width", metavar="LENGTH", default="85 mm", help="85 mm if not given")
    group.add_argument("--height", metavar="LENGTH", help="as what is shown needs if not given")
    group.add_argument(
        "--whole", action="store_true", help="outer layers in full, not as far as states reach"
    )
    parser.set_defaults(format=None, formats=("text",), output=None)


def run(args: argparse.Namespace) -> Answer:
    """Solve a stack and draw it into a file."""
    from ..pictures import check_path, save_picture, without_screen
    from ..report import text

    check_path(args.picture)
    without_screen()
    levels = levels_of(args)
    save_picture(draw(args, levels), args.picture)
    return Answer("", text.cautions_text(levels.cautions))


def draw(args: argparse.Namespace, levels: Levels) -> Axes:
    """Return the picture that was asked for."""
    from ..pictures import band_diagram, budget_bars

    size = {"width": args.width, "height": args.height}
    if args.show == "bands":
        return band_diagram(levels, whole=args.whole, **size)
    lines = levels.lines()
    title = f"{lines.main.name}, {lines.main.wavelength_um:.4g} µm" if lines.main else ""
    return budget_bars(lines.error_budget(), title=title, **size)
