"""Layer, Repeat, Stack: what is grown, immutable, hashable, in growth order.

Everything is checked here that needs no material. Values are stored in core units: thickness
in nm or ML as written, energies in eV, fields in V/nm, temperature in K.
"""

from .groups import MOST_LAYERS, Repeat, Written
from .layer import DOPING, PLANES, Layer, layer_name, numbered_layer
from .whole import Stack

__all__ = [
    "DOPING",
    "MOST_LAYERS",
    "PLANES",
    "Layer",
    "Repeat",
    "Stack",
    "Written",
    "layer_name",
    "numbered_layer",
]
