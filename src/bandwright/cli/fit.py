"""``bandwright fit``."""

from __future__ import annotations

import argparse

from .words import FORMATS, STACK_HELP, Answer, Parser, output_options, stack_of, stack_options


def options(parser: Parser) -> None:
    """Add the arguments and options of the command."""
    parser.add_argument("stack", metavar="STACK", help=STACK_HELP)
    group = parser.add_argument_group("what was measured, and what is looked for")
    group.add_argument(
        "--measured", metavar="FILE", required=True,
        help="lines, X-ray period and mismatch of the wafer (TOML)",
    )  # fmt: skip
    group.add_argument(
        "--factor", metavar="NAME", action="append",
        help="'flux Ga', 'all thicknesses', a thickness or a composition; may be repeated; the flux"
        " of every group-III element if not given",
    )  # fmt: skip
    group.add_argument(
        "--calibrations", metavar="FILE",
        help="rates by which the wafer was grown (TOML): adds the growth sheet of the next run",
    )  # fmt: skip
    group.add_argument(
        "--within", metavar="X", type=float, default=0.02,
        help="how far a fraction of that sheet may be off before it is an error, 0.02",
    )  # fmt: skip
    stack_options(parser)
    group = parser.add_argument_group("the solution")
    group.add_argument("--below", metavar="ENERGY", help="highest energy looked at, '0.4 eV'")
    bands = group.add_mutually_exclusive_group()
    for model in ("one-band", "two-band"):
        bands.add_argument(f"--{model}", dest="bands", action="store_const", const=model,
                           help=f"solve in the {model} model")  # fmt: skip
    output_options(parser, (*FORMATS, "markdown", "html"))


def run(args: argparse.Namespace) -> Answer:
    """Return what the reactor did, and the growth sheet of the next run."""
    from ..fitting import fit
    from ..report import data, fitted
    from ..report.html import html_page
    from ..report.text import sheet

    found = fit(stack_of(args.stack, args), args.measured, args.factor, below=args.below,
                bands=args.bands)  # fmt: skip
    growth = found.sheet(args.calibrations, within=args.within) if args.calibrations else None
    if args.format == "text":
        return Answer(fitted.fit_text(found, growth))
    if args.format == "markdown":
        return Answer(fitted.fit_markdown(found, growth))
    if args.format == "html":
        return Answer(html_page("Fit", fitted.fit_html(found, growth)))
    beside = sheet(fitted.fit_notes(found))
    if args.format == "csv":
        columns = {n: [data.plain(v) for v in cells] for n, cells in found.columns.items()}
        return Answer(data.csv_text(columns), beside)
    return Answer(data.json_text(fitted.fit_object(found, growth)), beside)
