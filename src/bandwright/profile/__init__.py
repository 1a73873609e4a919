"""Stack -> Profile: smooth sections of edge, mass and gap, the one thing solvers read."""

from .sections import (
    ZERO,
    Curve,
    LayerFacts,
    Origin,
    Polynomial,
    Profile,
    Ready,
    Sampled,
    Section,
)

__all__ = [
    "ZERO",
    "Curve",
    "LayerFacts",
    "Origin",
    "Polynomial",
    "Profile",
    "Ready",
    "Sampled",
    "Section",
]
