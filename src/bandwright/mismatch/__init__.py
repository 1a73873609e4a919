"""Strain of a stack on its substrate: mismatch, stress, critical thickness, and what balances it.

`films` measures each layer, `result` puts them together, `balance` finds the thickness or the
composition that brings the mean stress to zero.
"""

from .balance import Balance as Balance
from .films import Film as Film
from .films import Group as Group
from .films import film_of as film_of
from .films import films_of as films_of
from .films import groups_of as groups_of
from .films import substrate_of as substrate_of
from .result import Mismatches as Mismatches
from .result import mismatches as mismatches
