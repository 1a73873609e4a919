"""Mismatches: what the layers of a stack are off the substrate's lattice, and what follows."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

from ..cautions.strained import AsOne, runs_too_thick, strained_part, whole_too_thick
from ..cautions.words import listed
from ..frames import frame
from ..materials import Library
from ..stack import Stack
from ..strain import critical_thickness
from .balance import Balance, balanced
from .films import Film, Group, films_of, groups_of, substrate_of

if TYPE_CHECKING:
    import pandas as pd


@dataclass(frozen=True)
class Mismatches:
    """The strain of a stack, layer by layer and as a whole; `mismatches` makes it.

    Layers that bring their own numbers have no lattice: they are left out of every mean.

    Attributes
    ----------
    stack : Stack
    substrate_nm : float
        The substrate's lattice constant [nm].
    films : tuple of Film
        Every written layer, in growth order.
    """

    stack: Stack
    substrate_nm: float
    films: tuple[Film, ...]

    @property
    def left_out(self) -> tuple[str, ...]:
        """Names of the layers without a lattice."""
        return tuple(film.name for film in self.films if film.own)

    @property
    def thickness_nm(self) -> float:
        """Thickness of all grown layers that have a lattice [nm]."""
        return self._sum("thickness", weigh=False)

    @property
    def mean_mismatch(self) -> float:
        """Mean of (a - a_substrate)/a_substrate of relaxed lattices, weighted with thickness."""
        return self._sum("mismatch") / self.thickness_nm

    @property
    def mean_stress_GPa(self) -> float:
        """Mean stress in the plane [GPa], positive where stretched.

        Weighted with thickness over relaxed lattice constant, so that it is zero where the sum
        of t A e/a is: the balance in which the stack does not pull on its substrate.
        """
        return self._sum("pull") / self._sum("per_lattice")

    def _sum(self, name: str, weigh: bool = True) -> float:
        return math.fsum(
            film.copies * getattr(film, name) * (film.thickness if weigh else 1.0)
            for film in self.films
            if not film.own
        )

    @cached_property
    def _grown(self) -> list[Film]:
        return [self.films[number - 1] for _, number in self.stack.grown()]

    @cached_property
    def _strained(self) -> tuple[int, int]:
        """The places of the first and the last strained layer as grown; (0, -1) without any."""
        return strained_part([film.facts for film in self._grown])

    @cached_property
    def whole(self) -> AsOne | None:
        """All from the first to the last strained layer as one film; None without such layers.

        Its misfit is the mean weighted with thickness and stiffness, so that a balanced stack has
        none. Layers count as strained from 0.1 % on. None as well with a layer without a lattice.
        """
        first, last = self._strained
        if last < first or self.left_out:
            return None
        films = self._grown[first : last + 1]
        thickness = math.fsum(film.thickness for film in films)
        pull = math.fsum(film.thickness * film.pull for film in films)
        misfit = -pull / math.fsum(film.thickness * film.weight for film in films)
        poisson = math.fsum(film.thickness * film.poisson for film in films) / thickness
        case = "single layer" if last < len(self._grown) - 1 else "free surface"
        limit = critical_thickness(misfit, self.substrate_nm, poisson, case)
        return AsOne(thickness, misfit, limit, case)

    @property
    def table(self) -> pd.DataFrame:
        """One row a written layer with a lattice, index ``layer``.

        ``mismatch_percent`` is positive where the layer is pressed together, ``stress_GPa``
        negative there; of a grade both are means, ``worst_mismatch_percent`` is where it is
        farthest off, and critical thicknesses go by that. ``case`` names the prefactor of
        ``critical_thickness_nm`` (`bandwright.strain.critical_thickness`), on the substrate;
        ``critical_in_group_nm`` is the one of a layer of a repeated group against the others of the
        group (``"superlattice"``), once the group has come off the substrate's lattice.
        """
        return frame(self.columns, index="layer", texts=("layer", "case"))

    @property
    def columns(self) -> dict[str, list[Any]]:
        """The columns of `table`."""
        last = self.stack.grown()[-1][1] - 1
        groups = groups_of(self.stack, self.films)
        rows = []
        for place, film in enumerate(self.films):
            if film.own:
                continue
            case = "free surface" if place == last else "single layer"
            limit = critical_thickness(film.worst, self.substrate_nm, film.poisson, case)
            rows.append(
                {
                    "layer": film.name,
                    "copies": film.copies,
                    "thickness_nm": film.thickness,
                    "mismatch_percent": 100.0 * film.mismatch,
                    "worst_mismatch_percent": 100.0 * film.worst,
                    "stress_GPa": film.stress,
                    "case": case,
                    "critical_thickness_nm": limit,
                    "critical_in_group_nm": self._superlattice(place, groups),
                }
            )
        return {name: [row[name] for row in rows] for name in rows[0]}

    def _superlattice(self, place: int, groups: list[Group]) -> float | None:
        """Return a layer's critical thickness in its innermost group [nm], None without one."""
        film = self.films[place]
        for group in groups:  # an inner one comes first
            members = dict(group.members)
            if place not in members:
                continue
            others = [
                (self.films[at], times)
                for at, times in group.members
                if at != place and not self.films[at].own
            ]
            if not others:
                return None
            thickness = sum(other.thickness * times for other, times in others)
            mean = sum(o.thickness * times * o.mismatch for o, times in others) / thickness
            lattice = self.substrate_nm * (1.0 + mean)
            misfit = self.substrate_nm * (1.0 + film.worst) / lattice - 1.0
            return critical_thickness(misfit, lattice, film.poisson, "superlattice")
        return None

    @cached_property
    def cautions(self) -> tuple[str, ...]:
        """What a reader should know: layers that may relax, layers left out."""
        texts = runs_too_thick([film.facts for film in self._grown], self.substrate_nm)
        first, last = self._strained
        if self.whole is not None and last > first and not texts:
            texts = whole_too_thick(self._grown[first].name, self._grown[last].name, self.whole)
        if self.left_out:
            texts.append(
                f"{listed(self.left_out)}: own numbers, so no lattice; left out of every mean, and"
                " no critical thickness of the whole"
            )
        graded = [f.name for f in self.films if not f.own and f.worst != f.mismatch]
        if graded:
            texts.append(
                f"{listed(graded)}: graded; mismatch and stress are means along the layer, the"
                " critical thickness goes by the depth that is farthest off"
            )
        return tuple(texts)

    def balanced(self, name: str) -> Balance:
        """Return the change of one layer that brings the mean stress to zero.

        Parameters
        ----------
        name : str
            A thickness or composition as `bandwright.parameters` names it: ``"barrier.thickness"``,
            ``"layer 2.composition"``. Copies and layers of one label move together.

        Raises
        ------
        StackError
            If it is neither, or no value of it balances.
        UnknownName
            If the stack has no parameter of the name.

        Examples
        --------
        Invented: quantum wells pressed together between barriers that are stretched.

        >>> import bandwright as bw
        >>> stack = bw.Stack([bw.Repeat(20, [bw.Layer("8 nm", "In0.2Ga0.8As", label="well"),
        ...                   bw.Layer("10 nm", "GaAs0.9P0.1", label="barrier")])],
        ...                  substrate="GaAs")
        >>> balance = bw.mismatches(stack).balanced("barrier.thickness")
        >>> print(f"{balance.before:g} nm to {balance.after:.3f} nm")
        10 nm to 28.117 nm
        """
        return balanced(self.stack, name)

    def __str__(self) -> str:
        from ..report.strained import mismatch_text

        return mismatch_text(self)

    def _repr_html_(self) -> str:
        from ..report.strained import mismatch_html

        return mismatch_html(self)


def mismatches(stack: Stack) -> Mismatches:
    """Return the mismatch, stress and critical thickness of every layer, and of the whole.

    Parameters
    ----------
    stack : Stack
        With a substrate, to which every layer is strained.

    Raises
    ------
    StackError
        If the stack has no substrate, or no layer of a material.
    MaterialError, UnknownName
        If a material lacks a number that is needed.

    Notes
    -----
    Lattice and elastic constants are those of the material files, at 300 K. Critical thickness
    by J. W. Matthews and A. E. Blakeslee, J. Cryst. Growth 27, 118 (1974): a film may grow
    beyond it before it relaxes, so that it is a bound on the safe side.

    Examples
    --------
    Invented: one well pressed together on GaAs.

    >>> import bandwright as bw
    >>> found = bw.mismatches(bw.parse_line("20 nm GaAs, 8 nm In0.2Ga0.8As, 20 nm GaAs",
    ...                                     substrate="GaAs"))
    >>> print(found.table.loc["layer 2 (In0.2Ga0.8As)",
    ...                       ["mismatch_percent", "critical_thickness_nm"]].round(3).to_list())
    [1.433, 14.086]
    >>> print(f"{found.mean_mismatch:.3%}, {found.mean_stress_GPa:.3f} GPa")
    0.239%, -0.272 GPa
    """
    library = Library.with_files(stack.materials)
    return Mismatches(stack, substrate_of(stack, library), films_of(stack, library))
