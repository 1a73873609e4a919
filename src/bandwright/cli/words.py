"""What commands share: the parser, groups of options, and what is made of their values."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, NamedTuple, NoReturn

from ..errors import BandwrightError

if TYPE_CHECKING:
    from ..levels import Levels
    from ..stack import Stack

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
        self._action_max_length = 18  # argparse forgets that commands are indented twice


class Version(argparse.Action):
    """Print the version; it is looked up only when asked for."""

    def __call__(self, parser: argparse.ArgumentParser, *_: Any) -> NoReturn:
        """Print and leave."""
        from importlib.metadata import version

        print(f"bandwright {version('bandwright')}")
        parser.exit()


# -- options --------------------------------------------------------------------------------


def stack_options(parser: Parser) -> None:
    """Add what may take the place of what a stack says; `stack_of` reads it."""
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


def solve_options(parser: Parser, *, shooting_only: bool = False) -> None:
    """Add the arguments of `bandwright.solve`; `solve_arguments` reads them.

    ``shooting_only`` leaves out those that `bandwright.solve_many` does not have.
    """
    group = parser.add_argument_group("the solution")
    group.add_argument("--below", metavar="ENERGY", help="highest energy looked at, '0.4 eV'")
    group.add_argument("--at-most", metavar="N", type=int, help="most levels, from the lowest")
    bands = group.add_mutually_exclusive_group()
    for model in ("one-band", "two-band"):
        bands.add_argument(f"--{model}", dest="bands", action="store_const", const=model,
                           help=f"solve in the {model} model")  # fmt: skip
    group.add_argument("--tolerance", metavar="ENERGY", help="of each level, 1e-6 eV if not given")
    group.add_argument("--group", metavar="ENERGY", help="levels closer are copies, 0.01 meV")
    if not shooting_only:
        group.add_argument("--method", metavar="NAME", help="'shooting' or 'phase-integral'")
        group.add_argument(
            "--phase-order", metavar="N", type=int, help="of the phase integral, 1 or 2"
        )


def output_options(parser: Parser, formats: Sequence[str] = FORMATS) -> None:
    """Add the format, one of ``formats`` and the first if nothing says, and the file."""
    group = parser.add_argument_group("the output")
    group.add_argument(
        "--format", choices=formats, help=f"{formats[0]} if FILE's suffix says nothing else"
    )
    group.add_argument("--output", metavar="FILE", type=Path, help="write here, not to the screen")
    parser.set_defaults(formats=tuple(formats))


# -- what is made of their values -----------------------------------------------------------


def stack_of(text: str, args: argparse.Namespace) -> Stack:
    """Return the stack of a file or a line, with the changes that `stack_options` gave."""
    from ..stackline import read_any

    names = ("field", "bias", "electrons_run", "temperature", "substrate", "zero")
    changes: dict[str, Any] = {n: getattr(args, n) for n in names if getattr(args, n) is not None}
    for one, other in (("field", "bias"), ("bias", "field")):
        if one in changes:
            changes.setdefault(other, None)  # the one asked for takes the other's place
    if args.materials:
        changes["materials"] = tuple(args.materials)
    return read_any(text, **changes)


def solve_arguments(args: argparse.Namespace) -> dict[str, Any]:
    """Return the arguments of `bandwright.solve` that `solve_options` gave."""
    names = ("below", "at_most", "bands", "tolerance", "group", "method", "phase_order")
    given = {name: getattr(args, name, None) for name in names}
    return {name: value for name, value in given.items() if value is not None}


def over_of(texts: Sequence[str]) -> dict[str, str]:
    """Return what each ``--over NAME=VALUES`` varies, by name."""
    over: dict[str, str] = {}
    for text in texts:
        name, sign, values = (part.strip() for part in text.partition("="))
        if not (name and sign and values):
            raise UsageError(f"--over: got {text!r}; write a parameter, '=', and its values")
        if name in over:
            raise UsageError(f"--over: {name} is given more than once")
        over[name] = values
    return over


def levels_of(args: argparse.Namespace) -> Levels:
    """Return the levels of the one stack that was given."""
    from ..levels import solve

    return solve(stack_of(args.stack, args), **solve_arguments(args))
