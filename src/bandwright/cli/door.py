"""In by the command line, out by the streams: parse, run the command, print, leave."""

from __future__ import annotations

import argparse
import os
import re
import sys
import warnings
from collections.abc import Collection, Sequence
from importlib import import_module
from pathlib import Path

from ..errors import BandwrightError, BandwrightWarning, close_matches
from .words import Answer, Layout, Parser, UsageError, Version

#: each command's arguments and what it does, in the order of the help; its module has its name
COMMANDS = {
    "levels": ("STACK", "Find every level of a stack."),
    "lines": ("STACK", "Find the wavelengths a stack emits or detects."),
    "compare": ("STACK ...", "Set designs side by side, a row each."),
    "sweep": ("STACK --over NAME=VALUES", "Vary a stack over one or several ranges."),
    "aim": ("STACK --free NAME=SPAN", "Find the design whose lines have the wavelengths asked."),
    "anticrossings": ("STACK --over NAME=RANGE", "Find where levels come closest along a range."),
    "tolerance": ("STACK --spread NAME=AMOUNT", "Find what a growth's spreads do to wavelengths."),
    "grow": ("STACK --calibrations FILE", "Write the growth sheet of a stack, layer by layer."),
    "digital": ("STACK --layer NAME", "Turn graded layers or alloys into pulses; say what shifts."),
    "fit": ("STACK --measured FILE", "Find what a reactor did from what a wafer was measured."),
    "strain": ("STACK", "Find mismatch, stress and critical thickness of every layer."),
    "xray": ("STACK", "Find where X-ray diffraction will see a stack: period, satellites."),
    "picture": ("STACK --output FILE", "Draw a stack with its levels, a budget or a sweep."),
    "materials": ("[FORMULA ...]", "List the materials, or show formulas."),
}


def build(asked: Collection[str] = tuple(COMMANDS)) -> tuple[Parser, dict[str, Parser]]:
    """Return the parser of the command line, and those of the commands by name.

    Only the commands ``asked`` have their options, since each costs the import of its module.
    """
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
    for name, (what, job) in COMMANDS.items():
        made[name] = commands.add_parser(
            name,
            usage=f"bandwright {name} {what} [options]",
            help=job,
            description=job,
            formatter_class=Layout,
            allow_abbrev=False,
        )
        if name in asked:
            module = import_module(f".{name}", __package__)
            module.options(made[name])
            made[name].set_defaults(run=module.run)
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
    if argv and not argv[0].startswith("-") and argv[0] not in COMMANDS:
        raise UsageError(f"there is no command {argv[0]!r}{close_matches(argv[0], COMMANDS)}")
    top, made = build([word for word in argv if word in COMMANDS][:1])
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


def _format(args: argparse.Namespace) -> str:
    if args.format:
        return str(args.format)
    suffix = args.output.suffix[1:].lower() if args.output else ""
    suffix = {"md": "markdown", "htm": "html"}.get(suffix, suffix)
    return suffix if suffix in args.formats else str(args.formats[0])


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
    except KeyboardInterrupt as stopped:
        said = ["bandwright: interrupted", *getattr(stopped, "__notes__", ())]
        print("; ".join(said), file=sys.stderr)
        return 130
    return 0


def _fail(text: str) -> int:
    print("bandwright: " + " ".join(text.split()), file=sys.stderr)
    return 2
