"""Texts, words and names as a layer or stack takes them."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping

from ..errors import StackError, UnknownName, close_matches
from ..quantities import Density, as_density, as_length, number_text, show

_NUMBERED = re.compile(r"layer\s+\d+", re.IGNORECASE)


def one_line(value: object, name: str) -> str:
    """Return a given text, stripped."""
    if not isinstance(value, str) or not value.strip() or not value.isprintable():
        raise StackError(f"{name}: got {show(value)}; write one line of text")
    return str(value).strip()


def as_width(value: object, name: str) -> float:
    """Return the standard deviation of an interface [nm]."""
    width = as_length(value, name)
    if width < 0.0:
        raise StackError(
            f"{name}: got '{number_text(width)} nm'; a standard deviation is 0 nm or more"
        )
    return width


def as_plane(value: object, name: str) -> Density:
    """Return the sheet density of a doping plane."""
    density = as_density(value, name)
    if density.kind != "sheet":
        raise StackError(
            f"{name}: got {show(value)}; a plane has no thickness: write a density in the plane,"
            " such as '2e11 / cm^2'"
        )
    return density


def label_text(value: object, name: str) -> str:
    """Return a given label; what unlabelled layers are called is none."""
    label = one_line(value, name)
    if _NUMBERED.fullmatch(label):
        raise StackError(
            f"{name}: got {show(value)}; that is what layers without a label are called; take"
            " another"
        )
    return label


def word(value: object, words: tuple[str, ...], name: str) -> str:
    """Return a given word of a few known ones."""
    if isinstance(value, str) and value in words:
        return str(value)
    hint = close_matches(value, words) if isinstance(value, str) else ""
    if "mean" not in hint:
        hint = "; write " + " or ".join(repr(word) for word in words)
    raise StackError(f"{name}: got {show(value)}{hint}")


def known_names(given: Mapping[str, object], known: Iterable[str], where: str | None) -> None:
    """Raise `UnknownName` for the first input that is not known."""
    for name in given:
        if name not in known:
            raise UnknownName(f"{name!r} is no input{close_matches(name, known)}", where)
