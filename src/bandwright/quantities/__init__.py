"""Text or quantity in, plain float in core units out, and back: the only room that knows pint.

Texts are read by a pattern and a small table of units, exactly: the decimal number times the
decimal factor of its unit, rounded once. So 62 Å is the same float as 6.2 nm, and a written
value reads back as itself. Quantities of any pint registry are asked for their value by
``m_as``; pint itself is imported only to hand quantities out.

Core units: energy eV, length nm, field V/nm, bias V, temperature K, density nm^-2 or nm^-3.
"""

from .given import (
    as_density,
    as_energy,
    as_field,
    as_fraction,
    as_inverse_energy,
    as_length,
    as_mass,
    as_temperature,
    as_thickness,
    as_value,
    as_voltage,
)
from .rates import as_duration, as_rate
from .texts import (
    Density,
    Length,
    Rate,
    density_text,
    energy_text,
    field_text,
    inverse_energy_text,
    length_text,
    number_text,
    quantity,
    rate_text,
    show,
    temperature_text,
    voltage_text,
)

__all__ = [
    "Density",
    "Length",
    "Rate",
    "as_density",
    "as_duration",
    "as_energy",
    "as_field",
    "as_fraction",
    "as_inverse_energy",
    "as_length",
    "as_mass",
    "as_rate",
    "as_temperature",
    "as_thickness",
    "as_value",
    "as_voltage",
    "density_text",
    "energy_text",
    "field_text",
    "inverse_energy_text",
    "length_text",
    "number_text",
    "quantity",
    "rate_text",
    "show",
    "temperature_text",
    "voltage_text",
]
