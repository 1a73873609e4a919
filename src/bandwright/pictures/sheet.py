"""What all pictures share: paper, ink, type sizes, and the way into a file."""

from __future__ import annotations

import os
import re
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import PictureError
from ..quantities import as_length, show

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# Masataka Okabe and Kei Ito, "Color Universal Design (CUD): how to make figures and
# presentations that are friendly to colorblind people", 2002, revised 2008. Their yellow is left
# out: too pale on white.
BLACK = "#000000"
ORANGE = "#E69F00"
SKY = "#56B4E9"
GREEN = "#009E73"
BLUE = "#0072B2"
VERMILION = "#D55E00"
PURPLE = "#CC79A7"
#: in an order that sets neighbours apart
INKS = (BLUE, VERMILION, GREEN, PURPLE, ORANGE, SKY)
#: go with the inks, in a cycle of another length, so that no two curves share both
_DASHES = ((5.0, 1.5), (1.2, 1.2), (6.0, 1.5, 1.2, 1.5), (3.0, 1.0))
STROKES: tuple[Any, ...] = ("-", *((0, dashes) for dashes in _DASHES))
GROUND = "#ECECEC"
FAINT = "#6E6E6E"

#: keeps a unit on the line of its word
GAP = "\N{NO-BREAK SPACE}"
#: type [pt] that is read without a glass when printed one to one
BODY, SMALL = 7.0, 6.0
#: width of a line or patch in the legend with the gap behind it, and between columns [pt]
HANDLE, SPACE = 3.0 * SMALL, 1.2 * SMALL
#: lines [pt]
BOLD, PLAIN, THIN, HAIR = 1.1, 0.8, 0.6, 0.4
#: a column of a paper, and the height that goes with it [mm]
COLUMN = "85 mm"
HEIGHT = 62.0

SUFFIXES = (".png", ".svg")
_MM_PER_INCH = 25.4


def need_matplotlib() -> None:
    """Say how to get matplotlib where it is missing.

    Raises
    ------
    PictureError
        If it can't be imported.
    """
    try:
        import matplotlib  # noqa: F401 - whether it is there is all that is asked
    except ImportError:
        raise PictureError(
            "pictures need matplotlib; install it with pip install 'bandwright[plot]'"
        ) from None


def axes(ax: Axes | None, width: object, height: object, usual_mm: float = HEIGHT) -> Axes:
    """Return the Axes to draw on: the one given, or that of a new figure.

    Parameters
    ----------
    ax : Axes or None
    width, height : length
        Of a new figure, as ``"85 mm"``; None as height for the usual one.
    usual_mm : float
        The usual height [mm].

    Raises
    ------
    PictureError
        If matplotlib is missing, ``ax`` is no Axes, or the size is none a figure can have.
    """
    need_matplotlib()
    from matplotlib.axes import Axes

    if ax is not None:
        if not isinstance(ax, Axes):
            raise PictureError(f"ax: got {show(ax)}; give a matplotlib Axes, or None for a new one")
        return ax
    size = (_mm(width, "width"), usual_mm if height is None else _mm(height, "height"))
    from matplotlib import pyplot

    _, made = pyplot.subplots(
        figsize=(size[0] / _MM_PER_INCH, size[1] / _MM_PER_INCH), layout="constrained", dpi=200
    )
    return made


def _mm(value: object, name: str) -> float:
    length = as_length(value, name) * 1e-6
    if not 20.0 <= length <= 1000.0:
        raise PictureError(f"{name}: got {show(value)}; a picture is 20 mm to 1000 mm")
    return length


def dress(ax: Axes, x_label: str, y_label: str, title: str = "", left: float = 0.0) -> None:
    """Set labels, type and lines of an Axes; a title that is there already stays.

    ``left`` is what else stands left of the Axes [pt].
    """
    ax.set_ylabel(folded(y_label, max(60.0, cell(ax)[1] - 65.0)), fontsize=BODY)
    across = _across(ax)
    ax.set_xlabel(folded(x_label, across - 35.0), fontsize=BODY)
    ax.tick_params(labelsize=SMALL, width=THIN, length=2.5)
    for side, spine in ax.spines.items():
        spine.set_linewidth(THIN)
        spine.set_visible(side in ("left", "bottom"))
    if title and not ax.get_title(loc="left"):
        lines = [folded(line, across - left) for line in title.split("\n")]
        ax.set_title("\n".join(lines), loc="left", fontsize=BODY)


def width_of(text: str, size: float = BODY) -> float:
    """Return how wide a line of text is [pt]."""
    from matplotlib.font_manager import FontProperties
    from matplotlib.textpath import text_to_path

    font = FontProperties(size=size)
    return float(text_to_path.get_text_width_height_descent(text, font, False)[0])


def folded(text: str, width: float, size: float = BODY) -> str:
    """Return a text in as few lines as a width [pt] needs, all about as long.

    Examples
    --------
    >>> print(folded("energy from the lowest band edge", 100.0))
    energy from the
    lowest band edge
    """
    # a no-break space is no place to break
    words = [(word, width_of(word, size)) for word in re.split(r"[ \n]+", text) if word]
    gap = width_of("n n", size) - width_of("nn", size)
    lines = _lines(words, gap, width)
    for narrower in range(int(width), 0, -4):
        tried = _lines(words, gap, float(narrower))
        if len(tried) > len(lines):
            break
        lines = tried
    return "\n".join(lines)


def _lines(words: list[tuple[str, float]], gap: float, width: float) -> list[str]:
    """Return words in lines, each as long as fits."""
    lines: list[str] = []
    left = 0.0
    for word, wide in words:
        if lines and wide + gap <= left:
            lines[-1] += f" {word}"
            left -= wide + gap
        else:
            lines.append(word)
            left = width - wide
    return lines


def paper(ax: Axes) -> Figure:
    """Return the figure of an Axes, also where it stands in a part of a figure."""
    part = ax.figure
    assert part is not None
    whole: Figure = part.figure
    return whole


def cell(ax: Axes) -> tuple[float, float]:
    """Return width and height [pt] of what an Axes and all around it may take."""
    figure, place = paper(ax), ax.get_position()
    # an Axes has these parts of its cell before a layout is made
    width = 72.0 * figure.get_figwidth() * min(1.0, place.width / 0.775)
    height = 72.0 * figure.get_figheight() * min(1.0, place.height / 0.77)
    return width, height


def _across(ax: Axes) -> float:
    """Return how far it is from the left side of an Axes to the end of its cell [pt]."""
    lines = 1 + ax.get_ylabel().count("\n") if ax.get_ylabel() else 0
    return cell(ax)[0] - 30.0 - 1.25 * BODY * lines


def depth(ax: Axes) -> float:
    """Return how far below an Axes its numbers and label reach [pt]."""
    return 18.0 + 1.3 * BODY * (1 + ax.get_xlabel().count("\n"))


def legend(ax: Axes, handles: list[Any], note: str = "") -> None:
    """Set what lines mean below the Axes, where no curve runs, and a note above that."""
    from matplotlib.transforms import offset_copy

    across = _across(ax)
    below = offset_copy(ax.transAxes, fig=paper(ax), y=-depth(ax), units="points")
    longest = max((width_of(one.get_label(), SMALL) for one in handles), default=0.0)
    fit = int((across + SPACE) / (longest + HANDLE + SPACE))
    made = ax.legend(
        handles=handles, loc="upper left", bbox_to_anchor=(0.0, 0.0), bbox_transform=below,
        frameon=False, fontsize=SMALL, title=folded(note, across, SMALL) or None,
        title_fontsize=SMALL, ncols=max(1, min(4, fit)), borderaxespad=0.0, borderpad=0.0,
        handlelength=2.2, columnspacing=SPACE / SMALL, labelspacing=0.3, alignment="left",
    )  # fmt: skip
    made.set_gid("legend")


def save_picture(ax: Axes, path: str | os.PathLike[str]) -> None:
    """Write the figure of an Axes to a file, the same bytes for the same picture.

    Parameters
    ----------
    ax : Axes
        Any of the figure.
    path : path
        ``.png`` (600 dots an inch) or ``.svg``.

    Raises
    ------
    PictureError
        If the suffix is another, ``ax`` is no Axes, or the file can't be written.
    """
    need_matplotlib()
    import matplotlib
    from matplotlib.axes import Axes

    if not isinstance(ax, Axes):
        raise PictureError(f"ax: got {show(ax)}; give the Axes that a picture returned")
    check_path(path)
    figure = paper(ax)
    kind = Path(path).suffix.lower()
    metadata = {"Date": None} if kind == ".svg" else {"Software": None}
    try:
        # ids in the file come from a salt, which is drawn at random if not given
        with matplotlib.rc_context({"svg.hashsalt": "bandwright"}):
            figure.savefig(path, format=kind[1:], dpi=600, metadata=metadata)
    except OSError as error:
        why = f"can't be written: {error.strerror or error}"
        raise PictureError(why, os.fspath(path)) from None


def check_path(path: str | os.PathLike[str]) -> None:
    """Refuse a file that is no picture by its suffix, before anything is drawn.

    Raises
    ------
    PictureError
        With the suffixes that are known.

    Examples
    --------
    >>> check_path("levels.svg")
    """
    suffix = Path(path).suffix
    if suffix.lower() not in SUFFIXES:
        found = f"the suffix {suffix!r}" if suffix else "no suffix"
        raise PictureError(f"got {found}; name a file that ends with {' or '.join(SUFFIXES)}",
                           os.fspath(path))  # fmt: skip


def without_screen() -> None:
    """Draw into memory only, whatever screen there may be."""
    need_matplotlib()
    import matplotlib

    matplotlib.use("agg")
