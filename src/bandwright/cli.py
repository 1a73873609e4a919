"""The `bandwright` command: parse, call, print.

Nothing that computes is imported before a command runs, so that ``--help`` and ``--version``
answer at once.
"""

from __future__ import annotations

import argparse
import os
import re
import sys
import warnings
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, NamedTuple, NoReturn

from .errors import BandwrightError, BandwrightWarning, close_matches

if TYPE_CHECKING:
    from .levels import Levels
    from .stack import Stack

STACK_HELP = (
    "a stack file (TOML), or one line of text such as "
    "'30 nm Al0.28Ga0.72As, 6.2 nm GaAs, 30 nm Al0.28Ga0.72As'"
)
FORMATS = ("text", "csv", "json")


class Answer(NamedTuple):
    """What a command found: the data asked for, and the lines that must be said beside it.

    ``data`` goes to standard output or the file, ``beside`` to standard error; a text output
    holds those lines already.
    """

    data: str
    beside: Sequence[str] = ()


class UsageError(BandwrightError):
    """A command line that can't be understood."""


class Parser(argparse.ArgumentParser):
    """A parser that answers a mistake with one line."""

    def error(self, message: str) -> NoReturn:
        """Raise what argparse found as a `UsageError`."""
        raise UsageError(f"{message}; see {self.prog} --help")


class Layout(argparse.HelpFormatter):
    """Help in two columns, the first wide enough for every option."""

    def __init__(self, prog: str) -> None:
        super().__init__(prog, max_help_position=26, width=92)


class Version(argparse.Action):
    """Print the version; it is looked up only when asked for."""

    def __call__(self, parser: argparse.ArgumentParser, *_: Any) -> NoReturn:
        """Print and leave."""
        from importlib.metadata import version

        print(f"bandwright {version('bandwright')}")
        parser.exit()


# -- the command line -----------------------------------------------------------------------


def _stack_options(parser: Parser) -> None:
    group = parser.add_argument_group("the stack (each takes the place of what the stack says)")
    group.add_argument("--field", metavar="FIELD", help="electric field along growth, '12 kV/cm'")
    group.add_argument("--bias", metavar="VOLTAGE", help="surface minus substrate side, '0.3 V'")
    group.add_argument(
        "--electrons-run", metavar="WAY", help="'to surface' or 'to substrate'; field is a size"
    )
    group.add_argument("--temperature", metavar="T", help="'77 K'; 300 K if nothing says")
    group.add_argument("--substrate", metavar="FORMULA", help="what the layers are strained to")
    group.add_argument("--zero", metavar="NAME", help="material or label that energies count from")
    group.add_argument(
        "--materials", metavar="FILE", action="append", help="own material file; may be repeated"
    )


def _solve_options(parser: Parser) -> None:
    group = parser.add_argument_group("the solution")
    group.add_argument("--below", metavar="ENERGY", help="highest energy looked at, '0.4 eV'")
    group.add_argument("--at-most", metavar="N", type=int, help="most levels, from the lowest")
    bands = group.add_mutually_exclusive_group()
    for model in ("one-band", "two-band"):
        bands.add_argument(f"--{model}", dest="bands", action="store_const", const=model,
                           help=f"solve in the {model} model")  # fmt: skip
    group.add_argument("--tolerance", metavar="ENERGY", help="of each level, 1e-6 eV if not given")
    group.add_argument("--group", metavar="ENERGY", help="levels closer are copies, 0.01 meV")
    group.add_argument("--method", metavar="NAME", help="'shooting' or 'phase-integral'")
    group.add_argument("--phase-order", metavar="N", type=int, help="of the phase integral, 1 or 2")


def _output_options(parser: Parser) -> None:
    group = parser.add_argument_group("the output")
    group.add_argument("--format", choices=FORMATS, help="text if FILE's suffix says nothing else")
    group.add_argument("--output", metavar="FILE", type=Path, help="write here, not to the screen")


def build() -> tuple[Parser, dict[str, Parser]]:
    """Return the parser of the command line, and those of the commands by name."""
    top = Parser(
        prog="bandwright",
        formatter_class=Layout,
        description="Levels and wavelengths of quantum-well layer stacks, each with its evidence.",
        epilog="Each command has its own --help.",
        allow_abbrev=False,
    )
    top.add_argument("--version", action=Version, nargs=0, help="print the version and leave")
    commands = top.add_subparsers(
        dest="command", prog="bandwright", metavar="<command> ...", title="commands"
    )
    made: dict[str, Parser] = {}

    def command(name: str, what: str, job: str, run: Callable[..., Answer]) -> Parser:
        parser = commands.add_parser(
            name,
            usage=f"bandwright {name} {what} [options]",
            help=job,
            description=job,
            formatter_class=Layout,
            allow_abbrev=False,
        )
        parser.set_defaults(run=run)
        made[name] = parser
        return parser

    levels = command("levels", "STACK", "Find every level of a stack.", run_levels)
    lines = command("lines", "STACK", "Find the wavelengths a stack emits or detects.", run_lines)
    for parser in (levels, lines):
        parser.add_argument("stack", metavar="STACK", help=STACK_HELP)
    compare = command("compare", "STACK ...", "Set designs side by side, a row each.", run_compare)
    compare.add_argument("stacks", metavar="STACK", nargs="+", help=STACK_HELP)
    for parser in (levels, lines, compare):
        _stack_options(parser)
        _solve_options(parser)
    group = lines.add_argument_group("the lines shown")
    group.add_argument(
        "--window", nargs=2, metavar=("FROM", "TO"), help="of wavelengths, '8 um' '12 um'"
    )
    group.add_argument("--strength", metavar="F", type=float, help="least oscillator strength")
    group.add_argument("--of-box", action="store_true", help="those of the closed box as well")
    known = command(
        "materials", "[FORMULA ...]", "List the materials, or show formulas.", run_materials
    )
    known.add_argument("formulas", metavar="FORMULA", nargs="*", help="such as Al0.28Ga0.72As")
    known.add_argument("--temperature", metavar="T", help="300 K if not given")
    known.add_argument("--substrate", metavar="FORMULA", help="what they are strained to")
    known.add_argument(
        "--materials", metavar="FILE", action="append", help="own material file; may be repeated"
    )
    for parser in made.values():
        _output_options(parser)
    return top, made


def _joined(argv: Sequence[str]) -> list[str]:
    """Return the arguments with ``--field -12kV/cm`` as ``--field=-12kV/cm``."""
    out: list[str] = []
    for word in argv:
        option = bool(out) and out[-1].startswith("--") and "=" not in out[-1] and len(out[-1]) > 2
        if option and re.match(r"-[.\d]", word):
            out[-1] += "=" + word
        else:
            out.append(word)
    return out


def parse(argv: Sequence[str]) -> argparse.Namespace:
    """Return what a command line asks for.

    Raises
    ------
    UsageError
        With close matches for a command or an option that does not exist.
    """
    top, made = build()
    if argv and not argv[0].startswith("-") and argv[0] not in made:
        raise UsageError(f"there is no command {argv[0]!r}{close_matches(argv[0], made)}")
    args, left = top.parse_known_args(_joined(argv))
    if left:
        parser = made.get(args.command or "", top)
        known = [o for action in parser._actions for o in action.option_strings if len(o) > 2]
        wrong = left[0].partition("=")[0]
        what = "option" if wrong.startswith("-") else "further argument"
        likely = [option for option in known if option.startswith(wrong)] or known
        hint = close_matches(wrong, likely) if wrong.startswith("-") else "; quote a line of text"
        raise UsageError(f"{args.command or 'bandwright'} takes no {what} {wrong!r}{hint}")
    return args


# -- the commands ---------------------------------------------------------------------------


def _stack(text: str, args: argparse.Namespace) -> Stack:
    from .stackline import read_any

    names = ("field", "bias", "electrons_run", "temperature", "substrate", "zero")
    changes: dict[str, Any] = {n: getattr(args, n) for n in names if getattr(args, n) is not None}
    for one, other in (("field", "bias"), ("bias", "field")):
        if one in changes:
            changes.setdefault(other, None)  # the one asked for takes the other's place
    if args.materials:
        changes["materials"] = tuple(args.materials)
    return read_any(text, **changes)


def _solve_arguments(args: argparse.Namespace) -> dict[str, Any]:
    names = ("below", "at_most", "bands", "tolerance", "group", "method", "phase_order")
    return {name: getattr(args, name) for name in names if getattr(args, name) is not None}


def _levels(args: argparse.Namespace) -> Levels:
    from .levels import solve

    return solve(_stack(args.stack, args), **_solve_arguments(args))


def run_levels(args: argparse.Namespace) -> Answer:
    """Solve a stack and return its levels."""
    from .report import data, text

    levels = _levels(args)
    if args.format == "text":
        return Answer(text.levels_text(levels))
    beside = text.cautions_text(levels.cautions)
    if args.format == "csv":
        return Answer(data.csv_text(data.columns_of(levels.table)), beside)
    return Answer(data.json_text(data.levels_object(levels)), beside)


def run_lines(args: argparse.Namespace) -> Answer:
    """Solve a stack and return its lines."""
    from .report import data, text

    lines = _levels(args).lines(window=args.window, strength=args.strength, of_box=args.of_box)
    if args.format == "text":
        return Answer(text.lines_text(lines))
    beside = text.page(text.budget_text(lines), text.lines_notes(lines)).splitlines()
    if args.format == "csv":
        return Answer(data.csv_text(data.columns_of(lines.table)), beside)
    return Answer(data.json_text(data.lines_object(lines)), beside)


def run_compare(args: argparse.Namespace) -> Answer:
    """Solve several stacks and return one row for each."""
    from .comparison import DEFAULT, METRICS, Solved, compare
    from .report import data, text

    stacks = [_stack(each, args) for each in args.stacks]
    said: dict[Stack, tuple[str, ...]] = {}

    def heard(solved: Solved) -> None:
        said[solved.stack] = solved.levels.cautions

    metrics = {**{name: METRICS[name] for name in DEFAULT}, "heard": heard}
    table = compare(stacks, metrics, **_solve_arguments(args)).drop(columns="heard")
    columns = data.columns_of(table)
    cautions = [said.get(stack, ()) for stack in stacks]
    if args.format == "text":
        return Answer(text.compare_text(stacks, columns, cautions))
    beside = text.designs_cautions(cautions)
    if args.format == "csv":
        return Answer(data.csv_text(columns), beside)
    rows = [{**row, "cautions": list(texts)}
            for row, texts in zip(data.rows_of(columns), cautions, strict=True)]  # fmt: skip
    return Answer(data.json_text({"designs": rows}), beside)


def run_materials(args: argparse.Namespace) -> Answer:
    """List the materials, or show what is known about some formulas."""
    from .report import data, known, text

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


# -- the way out ----------------------------------------------------------------------------


def _format(args: argparse.Namespace) -> str:
    if args.format:
        return str(args.format)
    suffix = args.output.suffix[1:].lower() if args.output else ""
    return suffix if suffix in FORMATS else "text"


def _write(answer: Answer, output: Path | None) -> None:
    if output is None:
        # a screen that can't show a letter of a label gets its code, not a traceback
        coding = sys.stdout.encoding or "utf-8"
        sys.stdout.write(answer.data.encode(coding, "backslashreplace").decode(coding))
        sys.stdout.flush()
    else:
        output.write_text(answer.data, encoding="utf-8")
    for line in answer.beside:
        print(line, file=sys.stderr)


def main(argv: Sequence[str] | None = None) -> int:
    """Run the command line and return the exit status: 0, or 2 after one line on stderr."""
    argv = sys.argv[1:] if argv is None else argv
    try:
        args = parse(argv)
        if args.command is None:
            raise UsageError("a command is missing; see bandwright --help")
        args.format = _format(args)
        with warnings.catch_warnings():
            # the same sentences stand in the output as cautions
            warnings.simplefilter("ignore", BandwrightWarning)
            answer = args.run(args)
        _write(answer, args.output)
    except BrokenPipeError:
        # the reader has left; let the interpreter flush into nothing
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 1
    except BandwrightError as error:
        return _fail(str(error))
    except OSError as error:
        return _fail(f"{error.filename or 'output'}: {error.strerror or error}")
    except KeyboardInterrupt:
        print("bandwright: interrupted", file=sys.stderr)
        return 130
    return 0


def _fail(text: str) -> int:
    print("bandwright: " + " ".join(text.split()), file=sys.stderr)
    return 2


if __name__ == "__main__":
    sys.exit(main())
