"""``bandwright sweep``."""

from __future__ import annotations

import argparse
import csv
from pathlib import Path
from typing import Any

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
    group = parser.add_argument_group("the designs")
    group.add_argument(
        "--over", metavar="NAME=VALUES", action="append",
        help="what is swept: 'well.thickness=4nm..9nm step 0.5 nm', 'field=0 kV/cm..30 kV/cm count"
        " 7', 'well.x=0.1, 0.2'; may be repeated, for a grid",
    )  # fmt: skip
    group.add_argument(
        "--designs", metavar="FILE", type=Path, help="a CSV instead, a parameter a column"
    )
    group.add_argument(
        "--paired", action="store_true", help="first values with first, second with second; no grid"
    )
    stack_options(parser)
    group = parser.add_argument_group("the columns")
    group.add_argument(
        "--metric", metavar="NAME", action="append",
        help="such as wavelength_um, dipole_nm, level_2_meV, spacing_3_1_meV; may be repeated",
    )  # fmt: skip
    group.add_argument(
        "--line", nargs=2, metavar=("UPPER", "LOWER"),
        help="levels of the line; the strongest of the first design if not given",
    )  # fmt: skip
    group.add_argument(
        "--strongest", action="store_true", help="each design's own strongest line, which may hop"
    )
    group.add_argument(
        "--follow", action="store_true",
        help="follow the line by character: its levels have these numbers in the first design",
    )  # fmt: skip
    group.add_argument(
        "--window", nargs=2, metavar=("FROM", "TO"), help="of wavelengths, '8 um' '12 um'"
    )
    group.add_argument("--strength", metavar="F", type=float, help="least oscillator strength")
    solve_options(parser, shooting_only=True)
    group = parser.add_argument_group("the work")
    group.add_argument(
        "--results", metavar="FILE", type=Path,
        help="keep rows here as they come (CSV); the same command goes on where it was stopped",
    )  # fmt: skip
    group.add_argument("--workers", metavar="N", type=int, default=1, help="processes at work")
    group.add_argument("--chunk", metavar="N", type=int, help="designs solved together")
    output_options(parser)


def run(args: argparse.Namespace) -> Answer:
    """Sweep a stack and return one row a design."""
    from ..quantities import as_energy
    from ..report import data, swept
    from ..sweeps import sweep

    stack = stack_of(args.stack, args)
    over = _designs(args)
    table = sweep(
        stack, over, metrics=args.metric, line=_line(args), window=args.window,
        strength=args.strength, paired=args.paired or args.designs is not None,
        follow=args.follow,
        results=args.results, workers=args.workers, chunk=args.chunk, **solve_arguments(args),
    )  # fmt: skip
    columns, line = data.columns_of(table), table.attrs["line"]
    if args.format == "text":
        tolerance = as_energy(args.tolerance or "1e-6 eV", "tolerance")
        parameters = table.attrs["parameters"]
        text = swept.sweep_text(stack, columns, parameters, line, tolerance, args.follow)
        return Answer(text)
    beside = swept.failures_text(columns)
    if args.format == "csv":
        return Answer(data.csv_text(columns), beside)
    whole = {
        "stack": data.stack_object(stack),
        "parameters": list(table.attrs["parameters"]),
        "line": None if line is None else list(line),
        "designs": data.rows_of(columns),
    }
    return Answer(data.json_text(whole), beside)


def _designs(args: argparse.Namespace) -> dict[str, Any]:
    if bool(args.over) == bool(args.designs):
        given = "both are given" if args.over else "nothing is given"
        raise UsageError(
            f"--over or --designs says what is swept, and {given}; write for example --over"
            " 'well.thickness=4nm..9nm step 0.5 nm'"
        )
    if args.designs:
        return _columns(args.designs)
    return dict(over_of(args.over))


def _columns(path: Path) -> dict[str, Any]:
    """Return the columns of a CSV file as lists of text."""
    with open(path, encoding="utf-8-sig", newline="") as file:
        try:
            head, *rows = [row for row in csv.reader(file) if row and not row[0].startswith("#")]
        except (ValueError, csv.Error):
            raise UsageError(f"{path}: is no CSV with a line of parameters above rows") from None
    for number, row in enumerate(rows, start=1):
        if len(row) != len(head) or not all(cell.strip() for cell in row):
            raise UsageError(f"{path}: design {number} has not a value for each of the"
                             f" {len(head)} columns")  # fmt: skip
    names = [name.strip() for name in head]
    for name in names:
        if names.count(name) > 1:
            raise UsageError(f"{path}: {name!r} names more than one column")
    return {name: [row[place] for row in rows] for place, name in enumerate(names)}


def _line(args: argparse.Namespace) -> object:
    if args.line and args.strongest:
        raise UsageError("--line names one line for all designs, --strongest each its own")
    if args.strongest:
        return "strongest"
    if args.line is None:
        return None
    return tuple(int(end) if end.isascii() and end.isdigit() else end for end in args.line)
