"""Our closed list of units against pint, an independent unit system."""

from __future__ import annotations

from fractions import Fraction

import pint
import pytest

from tausheet.functions.units import _FAMILIES, _RATIOS, _ROOT, units_of

UREG = pint.UnitRegistry(non_int_type=Fraction)

PREFIXES = {"f": "femto", "p": "pico", "n": "nano", "u": "micro", "m": "milli", "k": "kilo",
            "M": "mega", "G": "giga", "": ""}  # fmt: skip

# our root, what pint calls it, and the base SI unit in which we keep it
ROOTS = {
    "s": ("second", "second"),
    "min": ("minute", "second"),
    "h": ("hour", "second"),
    "d": ("day", "second"),
    "Hz": ("hertz", "1 / second"),
    "1/s": ("1 / second", "1 / second"),
    "1/min": ("1 / minute", "1 / second"),
    "1/h": ("1 / hour", "1 / second"),
    "ohm": ("ohm", "ohm"),
    "S": ("siemens", "siemens"),
    "F": ("farad", "farad"),
    "H": ("henry", "henry"),
    "V": ("volt", "volt"),
    "A": ("ampere", "ampere"),
    "W": ("watt", "watt"),
    "VA": ("volt * ampere", "watt"),
    "var": ("volt * ampere", "watt"),
    "J": ("joule", "joule"),
    "Wh": ("watt * hour", "joule"),
    "C": ("coulomb", "coulomb"),
    "Ah": ("ampere * hour", "coulomb"),
    "Wb": ("weber", "weber"),
    "T": ("tesla", "tesla"),
    "V/s": ("volt / second", "volt / second"),
    "V/ms": ("volt / millisecond", "volt / second"),
    "V/us": ("volt / microsecond", "volt / second"),
    "A/s": ("ampere / second", "ampere / second"),
    "A/ms": ("ampere / millisecond", "ampere / second"),
    "A/us": ("ampere / microsecond", "ampere / second"),
    "A2s": ("ampere ** 2 * second", "ampere ** 2 * second"),
    "degC": ("delta_degree_Celsius", "kelvin"),
    "K": ("kelvin", "kelvin"),
    "K/W": ("kelvin / watt", "kelvin / watt"),
    "J/K": ("joule / kelvin", "joule / kelvin"),
    "J/(kg K)": ("joule / kilogram / kelvin", "joule / kilogram / kelvin"),
    "g": ("gram", "kilogram"),
    "deg": ("degree", "degree"),
    "%": ("percent", "dimensionless"),
    "ppm": ("ppm", "dimensionless"),
    "1": ("dimensionless", "dimensionless"),
}


@pytest.mark.parametrize("unit", sorted(_RATIOS))
def test_each_unit_has_the_size_that_pint_gives_it(unit: str) -> None:
    root = _ROOT[unit]
    name, base = ROOTS[root]
    size = UREG.parse_expression(PREFIXES[unit[: len(unit) - len(root)]] + name)
    assert UREG.Quantity(1, "") * size.to(base).magnitude == Fraction(*_RATIOS[unit])


def test_every_family_is_compared() -> None:
    assert ROOTS.keys() == _FAMILIES.keys()


@pytest.mark.parametrize(
    "quantity", ["resistance", "capacitance", "time", "energy", "charge", "power", "ratio"]
)
def test_units_of_one_quantity_have_one_dimension(quantity: str) -> None:
    dimensions = {
        UREG.parse_expression(ROOTS[_ROOT[unit]][0]).dimensionality for unit in units_of(quantity)
    }
    assert len(dimensions) == 1
