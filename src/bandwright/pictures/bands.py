"""The band diagram: edges along growth, each level at its energy, |psi|^2 standing on it."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import PictureError
from ..levels import Levels
from ..profile.valleys import Valleys, valleys
from ..quantities import show
from ..report.facts import completeness, direction
from .margin import LINE, Label, margin_labels
from .sheet import (
    BLACK,
    BOLD,
    COLUMN,
    FAINT,
    GAP,
    GROUND,
    HAIR,
    HEIGHT,
    INKS,
    PLAIN,
    THIN,
    axes,
    dress,
    legend,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes

Floats = npt.NDArray[np.float64]

#: X and L are drawn where they come this near to the highest level drawn, or below it [eV]
NEAR = 0.1
#: both methods are drawn where they are further apart than this part of the height of the picture
APART = 0.004
#: height of the tallest |psi|^2 as a part of the height of the picture, at least and at most
FLAT, TALL = 0.07, 0.2
#: |psi|^2 is drawn where it is more than this part of its own maximum
SEEN = 2e-3
#: outer layers are shown where a |psi|^2 is more than this part of its maximum, and so much more
REACH, BEYOND = 1e-3, 3.0
SIDE_STROKES = {"X": (0, (4.0, 1.5, 1.0, 1.5)), "L": (0, (1.0, 1.0))}
#: the side valleys' own shift by a strain below this is a few meV: not worth a note
NO_STRAIN = 1e-3
#: as many layers and levels are drawn with full lines; more make them thinner
EASY = 12
#: the tallest picture made for many labels [mm]
TALLEST = 130.0


class Rung(NamedTuple):
    """A row of the table of levels, as it is drawn; energies in eV."""

    numbers: tuple[int, int]
    energy: float
    phase: float
    density: Floats | None
    of_box: bool
    ink: str


class Span(NamedTuple):
    """What part of the structure [nm] and which energies [eV] a picture shows."""

    left: float
    right: float
    low: float
    high: float


def band_diagram(
    levels: Levels,
    ax: Axes | None = None,
    *,
    width: object = COLUMN,
    height: object = None,
    whole: bool = False,
) -> Axes:
    """Draw the band edge along growth, and each level at its energy with |psi|^2 standing on it.

    All |psi|^2 (the conduction part) have one scale, told below; a group of copies stands as the
    mean of its levels, a level that belongs to the closed box is dashed. Labels on the right give
    numbers and energies, and the phase integral's energy in parentheses where it differs in the
    digits shown. The edges at X and L are thin, and only where they come within 0.1 eV of the
    highest level or below it.

    Parameters
    ----------
    levels : Levels
    ax : Axes, optional
        Where to draw; a new figure of pyplot's if absent.
    width, height : length
        Size of a new figure, ``"85 mm"`` wide if not given, the height from the number of labels.
    whole : bool
        Whether outer layers are shown in full, not only as far as the states reach.

    Returns
    -------
    Axes

    Raises
    ------
    PictureError
        If there is no level, matplotlib is missing, or ``ax`` is no Axes.

    Examples
    --------
    >>> import bandwright as bw
    >>> levels = bw.solve(bw.parse_line("20 nm Al0.3Ga0.7As, 7 nm GaAs, 20 nm Al0.3Ga0.7As"))
    >>> ax = band_diagram(levels)
    >>> print(ax.get_title(loc="left"))
    no field
    """
    if not isinstance(levels, Levels):
        raise PictureError(f"levels: got {show(levels)}; give what bandwright.solve(stack) returns")
    if not len(levels):
        raise PictureError(
            f"there is no level to draw: {completeness(levels)}; raise the limit with"
            " below = '... eV', or read levels.cautions"
        )
    rungs, z = _rungs(levels)
    usual = min(TALLEST, max(HEIGHT, 36.0 + (len(rungs) + 1) * LINE * 25.4 / 72.0))
    ax = axes(ax, width, height, usual)
    span = _span(levels, rungs, z, whole)
    scale = _scale(rungs, span)
    span = _room(span, rungs, scale)
    sides = _side_edges(ax, levels, rungs, span)
    handles = [_edge(ax, levels, span), *sides]
    for rung in rungs:
        _stand(ax, rung, z, scale, span, PLAIN * _lean(len(rungs), EASY))
    apart = [rung for rung in rungs if _differs(rung, span)]
    for rung in apart:
        _phase_line(ax, levels, rung, z, span)
    handles += _meanings(rungs, bool(apart), levels)
    ax.set_xlim(span.left, span.right)
    ax.set_ylim(span.low, span.high)
    dress(
        ax, "z along growth, substrate \N{RIGHTWARDS ARROW} surface" + GAP + "(nm)",
        f"energy from {levels.profile.zero}{GAP}(eV)", _title(levels),
    )  # fmt: skip
    legend(ax, handles, _note(levels, rungs, scale, bool(sides)))
    _label(ax, rungs)
    return ax


def _rungs(levels: Levels) -> tuple[list[Rung], Floats]:
    """Return what to draw of each row, and the positions [nm] of the densities."""
    thickness = levels.profile.thickness
    points = int(np.clip(8.0 * thickness, 500, 3000))
    z = np.union1d(np.linspace(0.0, thickness, points), levels.profile.faces)
    squares = levels.states.sample(z)[0] ** 2 if levels.method == "shooting" else None
    box = levels.of_box if levels.method == "shooting" else np.zeros(len(levels), dtype=bool)
    rungs = [
        Rung(
            (group.start + 1, group.stop),
            float(np.mean(levels.energies[group])),
            float(np.mean(levels.phase_integral[group])),
            None if squares is None else squares[group].mean(axis=0),
            bool(box[group].any()),
            INKS[row % len(INKS)],
        )
        for row, group in enumerate(levels.groups)
    ]
    return rungs, z


def _span(levels: Levels, rungs: list[Rung], z: Floats, whole: bool) -> Span:
    """Return what the picture shows: all inner layers, and outer ones as far as states reach."""
    profile = levels.profile
    left, right = 0.0, profile.thickness
    densities = [rung.density for rung in rungs if rung.density is not None]
    if densities and not whole and len(profile.sections) > 2:
        reached = np.any([d > REACH * d.max() for d in densities], axis=0)
        first, last = z[reached][[0, -1]]
        if profile.ends[0] == "open":
            left = max(left, min(first, profile.faces[1]) - BEYOND)
        if profile.ends[1] == "open":
            right = min(right, max(last, profile.faces[-2]) + BEYOND)
    drawn = profile.sample(1000)
    inside = (drawn["position_nm"] >= left - 1e-9) & (drawn["position_nm"] <= right + 1e-9)
    edges = [*drawn["edge_eV"][inside], *np.interp([left, right], drawn["position_nm"],
                                                   drawn["edge_eV"])]  # fmt: skip
    energies = [rung.energy for rung in rungs]
    return Span(left, right, min(*edges, *energies), max(*edges, *energies))


def _room(span: Span, rungs: list[Rung], scale: float) -> Span:
    """Return a span with room for what stands on the levels, and a little around."""
    tops = [r.energy + scale * r.density.max() for r in rungs if r.density is not None]
    high = max(span.high, *tops) if tops else span.high
    tall = high - span.low
    return span._replace(low=span.low - 0.06 * tall, high=high + 0.04 * tall)


def _scale(rungs: list[Rung], span: Span) -> float:
    """Return the height [eV] of one |psi|^2 [1/nm], a round number from the levels' spacing."""
    peak = max((float(r.density.max()) for r in rungs if r.density is not None), default=1.0)
    tall = span.high - span.low
    energies = [rung.energy for rung in rungs]
    spacing = float(np.median(np.diff(energies))) if len(energies) > 1 else tall
    wanted = float(np.clip(0.9 * spacing, FLAT * tall, TALL * tall)) / peak
    decade = 10.0 ** math.floor(math.log10(wanted))
    return decade * max(step for step in (1.0, 2.0, 5.0) if step * decade <= wanted * (1 + 1e-12))


def _note(levels: Levels, rungs: list[Rung], scale: float, sides: bool) -> str:
    """Return what must be said of heights, and of X and L in strained layers."""
    told = []
    peak = max((float(r.density.max()) for r in rungs if r.density is not None), default=0.0)
    if peak > 0.0:
        unit = 10.0 ** math.floor(math.log10(peak))
        told.append(f"|\N{GREEK SMALL LETTER PSI}|² stands on its level: {unit:g} /nm is"
                    f" {unit * scale * 1e3:g} meV high")  # fmt: skip
    if sides and any(abs(fact.mismatch) > NO_STRAIN for fact in levels.profile.facts):
        told.append("X and L without their own shift by strain")
    return "; ".join(told)


def _lean(count: int, easy: int) -> float:
    """Return how much thinner lines are drawn where there are more than are easily told apart."""
    return float(np.clip(easy / max(count, 1), 0.5, 1.0))


def _edge(ax: Axes, levels: Levels, span: Span) -> Any:
    """Draw the conduction edge over shaded ground, and walls where there are."""
    drawn = levels.profile.sample(1500)
    z, edge = drawn["position_nm"], drawn["edge_eV"]
    ax.fill_between(z, edge, span.low, color=GROUND, linewidth=0.0, zorder=0).set_gid("ground")
    weight = BOLD * _lean(len(levels.profile.sections), EASY)
    (line,) = ax.plot(z, edge, color=BLACK, linewidth=weight, zorder=2, label="conduction edge",
                      solid_joinstyle="miter", gid="edge")  # fmt: skip
    faces = zip(levels.profile.ends, (0.0, levels.profile.thickness), strict=True)
    for place in (place for end, place in faces if end == "wall"):
        ax.axvline(place, color=BLACK, linewidth=3.0 * BOLD, zorder=3, gid="wall")
    return line


def _side_edges(ax: Axes, levels: Levels, rungs: list[Rung], span: Span) -> list[Any]:
    """Draw the edges at X and L in the sections where they matter."""
    found = valleys(levels.stack, levels.profile)
    limit = min(max(rung.energy for rung in rungs) + NEAR, span.high)
    seen = (found.position >= span.left - 1e-9) & (found.position <= span.right + 1e-9)
    handles = []
    for name, side in (("X", found.x_edge), ("L", found.l_edge)):
        z, energies = _where_low(found, side, limit, seen)
        if len(z):
            told = f"{name} edge"
            handles += ax.plot(z, energies, color=FAINT, linewidth=THIN, zorder=1.5,
                               linestyle=SIDE_STROKES[name], label=told, gid=told)  # fmt: skip
    return handles


def _where_low(
    found: Valleys, side: Floats, limit: float, seen: npt.NDArray[np.bool_]
) -> tuple[Floats, Floats]:
    """Return a side valley's edge in the sections where it comes below a limit, nan at jumps."""
    low = np.unique(found.section[seen & (side <= limit)])
    kept = np.isin(found.section, low)
    z, energies = found.position[kept], side[kept]
    apart = np.diff(found.section[kept])
    breaks = 1 + np.flatnonzero((apart > 1) | ((apart == 1) & (np.abs(np.diff(energies)) > 1e-6)))
    return np.insert(z, breaks, np.nan), np.insert(energies, breaks, np.nan)


def _stand(
    ax: Axes, rung: Rung, z: Floats, scale: float, span: Span, weight: float
) -> None:
    """Draw a level as a line and its |psi|^2 on it."""
    name = _numbers(rung)
    stroke = (0, (3, 1.5)) if rung.of_box else "-"
    ax.plot([span.left, span.right], [rung.energy] * 2, color=rung.ink, linewidth=HAIR,
            linestyle=(0, (1, 2)), zorder=2.5, gid=f"rest of {name}")  # fmt: skip
    if rung.density is None:
        return
    seen = rung.density > SEEN * rung.density.max()
    first, last = np.flatnonzero(seen)[[0, -1]]
    here = slice(max(first - 1, 0), last + 2)
    curve = rung.energy + scale * rung.density[here]
    ax.fill_between(z[here], rung.energy, curve, color=rung.ink, alpha=0.3, linewidth=0.0,
                    zorder=3).set_gid(f"fill {name}")  # fmt: skip
    ax.plot(z[here], curve, color=rung.ink, linewidth=weight, linestyle=stroke, zorder=4,
            gid=f"psi {name}")  # fmt: skip
    ax.plot(z[here][[0, -1]], [rung.energy] * 2, color=rung.ink, linewidth=weight,
            linestyle=stroke, zorder=4, gid=f"level {name}")  # fmt: skip


def _differs(rung: Rung, span: Span) -> bool:
    if rung.density is None:
        return True
    return abs(rung.phase - rung.energy) > APART * (span.high - span.low)


def _phase_line(ax: Axes, levels: Levels, rung: Rung, z: Floats, span: Span) -> None:
    """Draw a phase-integral energy where an electron of that energy may be."""
    drawn = levels.profile.sample(1500)
    edge = np.interp(z, drawn["position_nm"], drawn["edge_eV"])
    allowed = (edge <= rung.phase) & (z >= span.left) & (z <= span.right)
    height = np.where(allowed, rung.phase, np.nan)
    ax.plot(z, height, color=BLACK, linewidth=PLAIN, linestyle=(0, (2, 1.2)), zorder=5,
            gid=f"phase {_numbers(rung)}")  # fmt: skip


def _meanings(rungs: list[Rung], apart: bool, levels: Levels) -> list[Any]:
    """Return what a dashed line means, where there is one."""
    from matplotlib.lines import Line2D

    handles = []
    if apart:
        handles.append(Line2D([], [], color=BLACK, linewidth=PLAIN, linestyle=(0, (2, 1.2)),
                              label="phase integral"))  # fmt: skip
    if any(rung.of_box for rung in rungs):
        handles.append(Line2D([], [], color=FAINT, linewidth=PLAIN, linestyle=(0, (3, 1.5)),
                              label="belongs to the box"))  # fmt: skip
    if "wall" in levels.profile.ends:
        handles.append(Line2D([], [], color=BLACK, linewidth=3.0 * BOLD, label="wall"))
    return handles


def _title(levels: Levels) -> str:
    run = direction(levels)
    told = run if run == "no field" else f"electrons {run}"
    return f"{levels.stack.name}\n{told}" if levels.stack.name else told


def _numbers(rung: Rung) -> str:
    first, last = rung.numbers
    return f"{first}" if first == last else f"{first}\N{EN DASH}{last}"


def _meV(energy: float, digits: int) -> str:
    """Return an energy [eV] in meV.

    Examples
    --------
    >>> _meV(0.0479512, 1), _meV(float("nan"), 1)
    ('48.0', 'none')
    """
    if math.isnan(energy):
        return "none"
    return f"{energy * 1e3:.{digits}f}".replace("-", "\N{MINUS SIGN}")


def _label(ax: Axes, rungs: list[Rung]) -> None:
    """Name every level in the margin."""
    gaps = np.diff([rung.energy for rung in rungs]) * 1e3
    close = float(gaps.min()) if len(gaps) else 1.0
    digits = int(np.clip(1 - math.floor(math.log10(max(close, 1e-3))), 1, 3))
    labels, both = [], False
    for rung in rungs:
        energy, phase = (_meV(value, digits) for value in (rung.energy, rung.phase))
        text = f"{_numbers(rung)}  {energy}"
        if rung.density is not None and phase != energy:
            text, both = f"{text} ({phase})", True
        labels.append(Label(rung.energy, text, rung.ink))
    head = "level  meV (phase)" if both else "level  meV"
    margin_labels(ax, labels, head)
