"""Anticrossings along one parameter: where two levels come closest, and how close.

`path` makes and solves designs along the parameter, `candidates` finds on a coarse sweep which
levels may exchange their character and between which designs, `narrowest` refines one of them,
`search` puts all together.
"""

from .search import anticrossings as anticrossings
