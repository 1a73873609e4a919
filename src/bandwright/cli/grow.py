"""``bandwright grow``."""

from __future__ import annotations

import argparse
from typing import Any

from ..errors import StackError
from .words import (
    FORMATS,
    STACK_HELP,
    Answer,
    Parser,
    UsageError,
    output_options,
    solve_arguments,
    solve_options,
    stack_of,
    stack_options,
)


def options(parser: Parser) -> None:
    """Add the arguments and options of the command."""
    parser.add_argument("stack", metavar="STACK", help=STACK_HELP)
    group = parser.add_argument_group("the growth")
    group.add_argument(
        "--calibrations", metavar="FILE", help="rates of cells or alloys (TOML); no times without"
    )
    group.add_argument(
        "--order", choices=("first grown first", "surface first"), default="first grown first",
        help="of the list; 'first grown first' if not given",
    )  # fmt: skip
    group.add_argument(
        "--interruption", metavar="TIME", action="append",
        help="after every layer, '5 s', or after those of one name, 'well=10 s'; may be repeated",
    )  # fmt: skip
    group.add_argument(
        "--as-designed", action="store_true", help="grow thicknesses as designed, not whole ML"
    )
    group.add_argument(
        "--within", metavar="X", type=float, default=0.02,
        help="how far a fraction may be off before it is an error, 0.02",
    )  # fmt: skip
    group.add_argument(
        "--line", nargs="+", metavar="LEVEL",
        help="say what rounding does to a line: '2 1' or 'strongest'",
    )  # fmt: skip
    stack_options(parser)
    solve_options(parser, shooting_only=True)
    output_options(parser, (*FORMATS, "markdown", "html"))


def run(args: argparse.Namespace) -> Answer:
    """Return the growth sheet of a stack."""
    from ..growth import growth_sheet
    from ..report import data, growing
    from ..report.html import html_page
    from ..report.text import sheet as sentences

    found = growth_sheet(
        stack_of(args.stack, args), args.calibrations, order=args.order, line=_line(args.line),
        interruption=_pauses(args.interruption), whole=not args.as_designed, within=args.within,
        **solve_arguments(args),
    )  # fmt: skip
    if args.format == "text":
        return Answer(growing.sheet_text(found))
    if args.format == "markdown":
        return Answer(growing.sheet_markdown(found))
    if args.format == "html":
        return Answer(html_page("Growth sheet", growing.sheet_html(found)))
    beside = sentences(growing.sheet_notes(found))
    if args.format == "csv":
        return Answer(growing.sheet_csv(found), beside)
    return Answer(data.json_text(growing.sheet_object(found)), beside)


def _line(words: list[str] | None) -> Any:
    if words is None or words == ["strongest"]:
        return None if words is None else words[0]
    if len(words) != 2:
        raise StackError(f"line: got {' '.join(words)!r}; write two levels, '2 1', or 'strongest'")
    return tuple(int(w) if w.isdecimal() else w for w in words)


def _pauses(texts: list[str] | None) -> Any:
    """Return one time for all layers, or times by name."""
    if texts is None:
        return None
    if len(texts) == 1 and "=" not in texts[0]:
        return texts[0]
    pauses: dict[str, str] = {}
    for text in texts:
        name, sign, time = (part.strip() for part in text.rpartition("="))
        if not sign or not name:
            raise UsageError(f"--interruption: got {text!r}; write 'well=10 s' for each, or one"
                             " time alone")  # fmt: skip
        pauses[name] = time
    return pauses
