"""Which numbers of a stack give the wavelengths asked.

`asking` reads what is asked, `problem` solves a design and says how far it is off, `nearest` goes
to the nearest design, `raising` on to the largest dipole, `rounding` to whole monolayers;
`search` calls them, `result` holds what came out.
"""

from .result import Aimed as Aimed
from .search import aim as aim
