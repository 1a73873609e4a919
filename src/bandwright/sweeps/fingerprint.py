"""What a results file says it holds, so that nothing else is ever added to it."""

from __future__ import annotations

import functools
import hashlib
import inspect
import re
from collections.abc import Sequence
from importlib.metadata import version
from pathlib import Path
from textwrap import dedent
from typing import Any

from ..errors import BandwrightError
from ..shapes import Function
from ..stack import Stack
from .axes import Axis
from .making import maker
from .plan import Plan
from .work import Task

_ADDRESS = re.compile(r" at 0x[0-9a-fA-F]+")
_OURS = re.compile(r"bandwright(\.|$)")
#: a longer stack is not written out in the head
_LONGEST = 4000


def head_of(plan: Plan, task: Task, follow: bool = False) -> dict[str, Any]:
    """Return the first line of a results file, as JSON values: what decides its rows."""
    choice = task.choice
    followed = {"followed": True} if follow else {}
    return {
        "bandwright": version("bandwright"),
        "design": _design(plan),
        "over": {
            "designs": len(plan),
            "paired": plan.paired,
            "parameters": [_axis(axis) for axis in plan.axes],
        },
        "columns": {name: identity(metric) for name, metric in task.metrics.items()},
        "line": {
            "levels": None if choice.pair is None else list(choice.pair),
            "window_nm": list(choice.window),
            "strength": choice.strength,
            **followed,
        },
        "solved": dict(task.arguments),
    }


def _design(plan: Plan) -> dict[str, Any]:
    if isinstance(plan.design, Stack):
        text = stack_text(plan.design)
        return {"name": plan.design.name, "stack": text[:_LONGEST], "digest": digest(text)}
    ends = [stack_text(stack) for stack in _ends(plan)]
    return {"function": _name(plan.design), "digest": digest(identity(plan.design), *ends)}


def _ends(plan: Plan) -> list[Stack | str]:
    """Return the first and the last stack that a function makes, or what is wrong with them."""
    make = maker(plan.design, [axis.name for axis in plan.axes], [a.unit for a in plan.axes])
    made = make(plan.values([0, len(plan) - 1]))
    return [str(one) if isinstance(one, BandwrightError) else one for one in made]


def stack_text(stack: Stack | str) -> str:
    """Return everything that decides a stack's levels, as text that is alike in all processes."""
    if isinstance(stack, str):
        return _ADDRESS.sub("", stack)
    parts = [_ADDRESS.sub("", repr(stack))]
    for written in stack.written():
        functions = [s.function for _, s in written.layer.shapes if isinstance(s, Function)]
        parts += [identity(function) for function in functions]
    parts += [digest(Path(path).read_bytes()) for path in stack.materials if Path(path).is_file()]
    return "\n".join(parts)


def identity(value: Any) -> str:
    """Return what a function is, as text: its source if it has one; ours by name."""
    if isinstance(value, functools.partial):
        bound = (value.args, sorted(value.keywords.items()))
        return f"{identity(value.func)} with {_ADDRESS.sub('', repr(bound))}"
    kind = value if inspect.isroutine(value) or inspect.isclass(value) else type(value)
    own = "" if kind is value else _ADDRESS.sub("", repr(value))
    if _OURS.match(getattr(kind, "__module__", None) or ""):
        return own or _name(value)
    return f"{_name(kind)}{own} {digest(_source(kind))}"


def _source(kind: Any) -> str:
    try:
        return dedent(inspect.getsource(kind))
    except (OSError, TypeError):  # from a prompt, or written in C
        code = getattr(kind, "__code__", None)
        return "" if code is None else repr((code.co_code, code.co_names, _plain(code.co_consts)))


def _plain(constants: Sequence[Any]) -> str:
    return _ADDRESS.sub("", repr(constants))


def _axis(axis: Axis) -> dict[str, Any]:
    shown = [axis.shown[0], axis.shown[-1]]
    values = [_ADDRESS.sub("", repr(value)) for value in axis.values]
    return {"column": axis.column, "values": len(axis), "first_and_last": shown,
            "digest": digest(*values)}  # fmt: skip


def _name(value: Any) -> str:
    return getattr(value, "__qualname__", None) or type(value).__qualname__


def digest(*parts: str | bytes) -> str:
    """Return a short digest of texts, the same in all processes.

    Examples
    --------
    >>> digest("well", "wall") == digest("well", "wall") != digest("wellwall")
    True
    """
    total = hashlib.sha256()
    for part in parts:
        data = part.encode("utf-8", "backslashreplace") if isinstance(part, str) else part
        total.update(len(data).to_bytes(8, "big") + data)
    return total.hexdigest()[:32]
