"""``bandwright materials``."""

from __future__ import annotations

import argparse

from .words import Answer, Parser, output_options


def options(parser: Parser) -> None:
    """Add the arguments and options of the command."""
    parser.add_argument("formulas", metavar="FORMULA", nargs="*", help="such as Al0.28Ga0.72As")
    parser.add_argument("--temperature", metavar="T", help="300 K if not given")
    parser.add_argument("--substrate", metavar="FORMULA", help="what they are strained to")
    parser.add_argument(
        "--materials", metavar="FILE", action="append", help="own material file; may be repeated"
    )
    output_options(parser)


def run(args: argparse.Namespace) -> Answer:
    """List the materials, or show what is known about some formulas."""
    from ..report import data, known, text

    found = known.known(args.formulas, args.temperature, args.substrate, args.materials or ())
    if args.format == "text":
        return Answer(text.materials_text(found))
    beside = text.cautions_text(found.cautions)
    if args.format == "csv":
        return Answer(data.csv_text(found.columns), beside)
    whole = {
        "materials": data.rows_of(found.columns),
        "facts": data.rows_of(found.facts),
        "cautions": list(found.cautions),
    }
    return Answer(data.json_text(whole), beside)
