"""Levels and lines followed by character, not by number, from design to design.

`overlapping` lays the states of two designs on each other, `matching` says which level is which,
`tracks` goes along a sequence of designs, `line` gives one line in each of them.
"""

from .line import follow_line as follow_line
from .line import followed_pairs as followed_pairs
from .matching import matched as matched
from .overlapping import overlaps as overlaps
from .tracks import Tracked as Tracked
from .tracks import along as along
from .tracks import follow as follow
