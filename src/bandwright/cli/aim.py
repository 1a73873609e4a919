"""``bandwright aim``."""

from __future__ import annotations

import argparse
from collections.abc import Sequence

from .words import (
    STACK_HELP,
    Answer,
    Parser,
    UsageError,
    output_options,
    stack_of,
    stack_options,
)


def options(parser: Parser) -> None:
    """Add the arguments and options of the command."""
    parser.add_argument("stack", metavar="STACK", help=STACK_HELP)
    group = parser.add_argument_group("what may change, and what is asked")
    group.add_argument(
        "--free", metavar="NAME=SPAN", action="append",
        help="a parameter and its bounds, 'well.thickness=4nm..9nm'; may be repeated",
    )  # fmt: skip
    group.add_argument(
        "--line", metavar="LINE=VALUE", action="append",
        help="a line or spacing and its wavelength or energy, '2 to 1=10.3um', '3 to 2=120 meV';"
        " may be repeated",
    )  # fmt: skip
    group.add_argument(
        "--weight", metavar="LINE=NUMBER", action="append",
        help="what a line counts where not all can be met; 1 if not given",
    )  # fmt: skip
    group.add_argument(
        "--maximise", metavar="WHAT", help="'dipole 3 to 2' or 'oscillator strength 3 to 2'"
    )
    group.add_argument(
        "--limit", metavar="WHAT=SPAN", action="append",
        help="of the thickness or of a line, 'thickness=..60nm', '2 to 1=34meV..38meV'",
    )  # fmt: skip
    group.add_argument(
        "--grid", metavar="NAME=STEP", action="append",
        help="whole steps of a free parameter that is no thickness, 'well.x=0.01'",
    )  # fmt: skip
    stack_options(parser)
    group = parser.add_argument_group("the search")
    group.add_argument("--starts", metavar="N", type=int, help="starts followed, the best kept")
    group.add_argument(
        "--follow", action="store_true", help="levels keep their character, not their number"
    )
    group.add_argument("--below", metavar="ENERGY", help="highest energy looked at, '0.4 eV'")
    bands = group.add_mutually_exclusive_group()
    for model in ("one-band", "two-band"):
        bands.add_argument(f"--{model}", dest="bands", action="store_const", const=model,
                           help=f"solve in the {model} model")  # fmt: skip
    output_options(parser)


def run(args: argparse.Namespace) -> Answer:
    """Aim a stack, and return the design that was found."""
    from ..aiming import aim
    from ..report import aimed, data, text

    stack = stack_of(args.stack, args)
    weighed = _pairs(args.weight, "--weight")
    weights = {name: _number(value, name) for name, value in weighed.items()}
    found = aim(
        stack, _pairs(args.free, "--free"), _pairs(args.line, "--line"), weights=weights,
        maximise=args.maximise, limits=_pairs(args.limit, "--limit"), starts=args.starts,
        follow=args.follow, grid=_pairs(args.grid, "--grid"), below=args.below, bands=args.bands,
    )  # fmt: skip
    if args.format == "text":
        return Answer(aimed.aimed_text(found))
    beside = text.page([found.message], text.cautions_text(found.levels.cautions)).splitlines()
    if args.format == "csv":
        return Answer(data.csv_text(aimed.values_columns(found)), beside)
    return Answer(data.json_text(aimed.aimed_object(found)), beside)


def _pairs(given: Sequence[str] | None, option: str) -> dict[str, str]:
    """Return what stands before and behind each '='."""
    found: dict[str, str] = {}
    for each in given or ():
        name, sign, value = (part.strip() for part in each.partition("="))
        if not (name and sign and value):
            raise UsageError(f"{option}: got {each!r}; write a name, '=', and its value")
        if name in found:
            raise UsageError(f"{option}: {name} is given more than once")
        found[name] = value
    return found


def _number(text: str, name: str) -> float:
    try:
        return float(text)
    except ValueError:
        raise UsageError(f"--weight: got {text!r} for {name}; a number is due") from None
