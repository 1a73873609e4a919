"""Levels by the phase integral: a method of its own beside shooting, and each level's budget."""

from .search import count, exact, levels

__all__ = ["count", "exact", "levels"]
