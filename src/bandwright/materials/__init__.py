"""Materials: files, mixing of binaries to alloys, and the edge, mass and gap that follow."""

from .library import BandPoint, Library

__all__ = ["BandPoint", "Library"]
