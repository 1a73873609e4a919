"""Stack -> Profile: smooth sections of edge, mass and gap, the one thing solvers read."""

from .sections import (
    ZERO,
    Curve,
    LayerFacts,
    Polynomial,
    Profile,
    Sampled,
    Section,
)

__all__ = ["ZERO", "Curve", "LayerFacts", "Polynomial", "Profile", "Sampled", "Section"]
