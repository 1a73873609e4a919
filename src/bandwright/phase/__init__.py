"""Phase integral: levels from whole numbers of half waves, and the budget that explains them."""

from .budget import Well, budget
from .search import count, exact, followed, levels

__all__ = ["Well", "budget", "count", "exact", "followed", "levels"]
