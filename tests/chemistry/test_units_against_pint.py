"""Our table of units beside a general library's: pint (BSD), whose factors come from its own definitions file.

The table answers without loading it, so every name and prefix in it is compared here.
"""

import itertools

import pint
import pytest

from moletally.chemistry.quantity import parse_unit
from moletally.chemistry.unit_names import OFFSET, PLAIN, PREFIXED

UNITS = pint.UnitRegistry(system="SI", cache_folder=None)
BASES = ("[substance]", "[length]", "[time]", "[mass]", "[temperature]")

# where the trade's name is another there, or means another unit
THERE = {
    "lbmol": "453.59237 mol", "bbl": "oil_bbl", "gpm": "gal/minute", "cfm": "foot**3/minute", "lpm": "L/minute", "Torr": "torr",
    "BTU": "Btu_it", "MMBTU": "1e6 Btu_it", "Wh": "W*hour", "cal_IT": "international_calorie",
    "kcal_IT": "1000 international_calorie", "MWh": "1e6 W*hour", "min": "minute",
}  # fmt: skip


def there(name):
    """Factor to SI and dimension."""
    quantity = UNITS.Quantity(1.0, UNITS.parse_expression(THERE.get(name, name)).units).to_base_units()
    scale = UNITS.Quantity(THERE.get(name, name)).to_base_units().magnitude
    powers = dict(quantity.dimensionality)
    return scale, tuple(float(powers.pop(base, 0)) for base in BASES)


PREFIXED_NAMES = [prefix + name for name, (_, _, _, takes) in PREFIXED.items() for prefix in ("", *takes)]
NAMES = sorted({*PLAIN, *PREFIXED_NAMES})


@pytest.mark.parametrize("name", NAMES)
def test_every_name_has_the_factor_and_dimension_it_has_there(name):
    factor, dims = there(name)
    ours = parse_unit(name)
    assert ours.dims == dims
    assert ours.factor == pytest.approx(factor, rel=1e-14)
    assert ours.offset == 0


@pytest.mark.parametrize("name", ["degC", "degF"])
@pytest.mark.parametrize("degrees", [-40.0, 0.0, 25.0, 451.0])
def test_shifted_temperatures(name, degrees):
    assert parse_unit(name).to_si(degrees) == pytest.approx(
        UNITS.Quantity(degrees, name).to("K").magnitude, rel=1e-14
    )


def test_gauge_pressures_are_above_one_atmosphere():
    """They have no counterpart there: by their definition, p = p_gauge + 101325 Pa."""
    bases = {"barg": "bar", "psig": "psi", "kPag": "kPa", "atmg": "atm"}
    assert {name for name, (_, dims, _) in OFFSET.items() if dims != (0, 0, 0, 0, 1)} == bases.keys()
    for name, base in bases.items():
        assert parse_unit(name).to_si(2.0) == pytest.approx(2.0 * there(base)[0] + 101325.0, rel=1e-14)


AMOUNTS, VOLUMES, TIMES = (
    ("mol", "kmol", "mmol", "lbmol", "g", "lb"),
    ("L", "mL", "m^3", "ft^3", "gal"),
    ("s", "min", "h", "d"),
)


def test_compound_units():
    count = 0
    for amount, volume, time in itertools.product(AMOUNTS, VOLUMES, TIMES):
        a, v, t = there(amount)[0], there(volume)[0], there(time)[0]
        for text, factor in (
            (f"{amount}/{volume}", a / v), (f"{volume}/({amount} {time})", v / a / t), (f"{amount}/{time}", a / t),
            (f"({volume})^2/({amount}^2*{time})", (v / a) ** 2 / t), (f"({volume}/{amount})^0.5/{time}", (v / a) ** 0.5 / t),
            (f"{amount} ({volume})^-1 {time}^-1", a / v / t),
        ):  # fmt: skip
            assert parse_unit(text).factor == pytest.approx(factor, rel=1e-13), text
            count += 1
    assert count == 720
