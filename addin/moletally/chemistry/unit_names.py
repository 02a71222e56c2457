"""Names of units in the trade's writing, with exact factors to SI.

Factors are exact fractions: definitions of the SI brochure and of NIST SP 811 (2008), appendix B
(inch 0.0254 m, pound 0.45359237 kg, calorie 4.184 J thermochemical, BTU of the International Table
1055.05585262 J, US gallon 231 in3, pound-force with g_n = 9.80665 m/s2, Torr 101325/760 Pa).
"""

from dataclasses import dataclass
from fractions import Fraction

__all__ = ["ATMOSPHERE", "REFUSED", "NamedUnit", "known_names", "look_up"]

Dims = tuple[int, int, int, int, int]  # amount, length, time, mass, temperature


@dataclass(frozen=True, slots=True)
class NamedUnit:
    """One name: factor and offset to SI, dimensions, and the time unit hidden in it, if any."""

    name: str
    factor: Fraction
    dims: Dims
    offset: Fraction = Fraction(0)


AMOUNT: Dims = (1, 0, 0, 0, 0)
LENGTH: Dims = (0, 1, 0, 0, 0)
VOLUME: Dims = (0, 3, 0, 0, 0)
TIME: Dims = (0, 0, 1, 0, 0)
MASS: Dims = (0, 0, 0, 1, 0)
TEMPERATURE: Dims = (0, 0, 0, 0, 1)
PRESSURE: Dims = (0, -1, -2, 1, 0)
FORCE: Dims = (0, 1, -2, 1, 0)
ENERGY: Dims = (0, 2, -2, 1, 0)
POWER: Dims = (0, 2, -3, 1, 0)
VISCOSITY: Dims = (0, -1, -1, 1, 0)
FLOW: Dims = (0, 3, -1, 0, 0)

POUND = Fraction("0.45359237")
FOOT = Fraction("0.3048")
INCH = Fraction("0.0254")
GALLON = 231 * INCH**3
LITRE = Fraction(1, 1000)
POUND_FORCE = POUND * Fraction("9.80665")
PSI = POUND_FORCE / INCH**2
ATMOSPHERE = Fraction(101325)
BTU = Fraction("1055.05585262")
CALORIE = Fraction("4.184")
RANKINE = Fraction(5, 9)
ICE_POINT = Fraction("273.15")

PREFIXES = {
    "n": Fraction(1, 10**9), "µ": Fraction(1, 10**6), "μ": Fraction(1, 10**6), "u": Fraction(1, 10**6),
    "m": Fraction(1, 1000), "c": Fraction(1, 100), "d": Fraction(1, 10), "h": Fraction(100),
    "k": Fraction(1000), "M": Fraction(10**6), "G": Fraction(10**9),
}  # fmt: skip

# name -> (canonical name, factor, dims, prefixes it takes)
PREFIXED: dict[str, tuple[str, Fraction, Dims, str]] = {
    "mol": ("mol", Fraction(1), AMOUNT, "nµμumk"),
    "m": ("m", Fraction(1), LENGTH, "nµμumcdk"),
    "L": ("L", LITRE, VOLUME, "µμumcdh"),
    "l": ("L", LITRE, VOLUME, "µμumcdh"),
    "s": ("s", Fraction(1), TIME, "nµμum"),
    "g": ("g", Fraction(1, 1000), MASS, "nµμumk"),
    "Pa": ("Pa", Fraction(1), PRESSURE, "mhkMG"),
    "bar": ("bar", Fraction(10**5), PRESSURE, "m"),
    "N": ("N", Fraction(1), FORCE, "mk"),
    "J": ("J", Fraction(1), ENERGY, "mkMG"),
    "W": ("W", Fraction(1), POWER, "mkMG"),
    "cal": ("cal", CALORIE, ENERGY, "k"),
    "P": ("P", Fraction(1, 10), VISCOSITY, "cm"),
}

PLAIN: dict[str, tuple[Fraction, Dims]] = {
    "lbmol": (1000 * POUND, AMOUNT), "min": (Fraction(60), TIME), "h": (Fraction(3600), TIME),
    "d": (Fraction(86400), TIME), "week": (Fraction(604800), TIME),
    "in": (INCH, LENGTH), "ft": (FOOT, LENGTH), "yd": (3 * FOOT, LENGTH),
    "gal": (GALLON, VOLUME), "bbl": (42 * GALLON, VOLUME), "cc": (Fraction(1, 10**6), VOLUME),
    "lb": (POUND, MASS), "t": (Fraction(1000), MASS),
    "gpm": (GALLON / 60, FLOW), "cfm": (FOOT**3 / 60, FLOW), "lpm": (LITRE / 60, FLOW),
    "atm": (ATMOSPHERE, PRESSURE), "psi": (PSI, PRESSURE), "Torr": (ATMOSPHERE / 760, PRESSURE),
    "mmHg": (Fraction("133.322387415"), PRESSURE), "lbf": (POUND_FORCE, FORCE),
    "BTU": (BTU, ENERGY), "MMBTU": (10**6 * BTU, ENERGY), "Wh": (Fraction(3600), ENERGY),
    "kWh": (Fraction(3_600_000), ENERGY), "MWh": (Fraction(3_600_000_000), ENERGY),
    "cal_IT": (Fraction("4.1868"), ENERGY), "kcal_IT": (Fraction("4186.8"), ENERGY),
    "K": (Fraction(1), TEMPERATURE), "degR": (RANKINE, TEMPERATURE),
}  # fmt: skip

OFFSET: dict[str, tuple[Fraction, Dims, Fraction]] = {
    "degC": (Fraction(1), TEMPERATURE, ICE_POINT),
    "degF": (RANKINE, TEMPERATURE, ICE_POINT - 32 * RANKINE),
    "barg": (Fraction(10**5), PRESSURE, ATMOSPHERE),
    "psig": (PSI, PRESSURE, ATMOSPHERE),
    "kPag": (Fraction(1000), PRESSURE, ATMOSPHERE),
    "atmg": (ATMOSPHERE, PRESSURE, ATMOSPHERE),
}

ALIASES = {
    "sec": "s", "second": "s", "seconds": "s", "mins": "min", "minute": "min", "minutes": "min",
    "hr": "h", "hrs": "h", "hour": "h", "hours": "h", "day": "d", "days": "d", "weeks": "week",
    "litre": "L", "litres": "L", "liter": "L", "liters": "L", "ℓ": "L", "ccm": "cc",
    "mole": "mol", "moles": "mol", "gmol": "mol", "kgmol": "kmol", "lb-mol": "lbmol", "lbmole": "lbmol",
    "g-mol": "mol", "kg-mol": "kmol", "pound": "lb", "lbm": "lb", "lbs": "lb", "tonne": "t", "foot": "ft",
    "feet": "ft", "inch": "in", "gallon": "gal", "gallons": "gal", "barrel": "bbl", "barrels": "bbl",
    "GPM": "gpm", "LPM": "lpm", "CFM": "cfm",
    "bara": "bar", "bar(a)": "bar", "bar(g)": "barg", "psia": "psi", "psi(a)": "psi", "psi(g)": "psig",
    "kPaa": "kPa", "kPa(a)": "kPa", "kPa(g)": "kPag", "torr": "Torr", "Btu": "BTU", "MMBtu": "MMBTU",
    "°C": "degC", "℃": "degC", "ºC": "degC", "celsius": "degC", "°F": "degF", "℉": "degF", "ºF": "degF",
    "°R": "degR", "ºR": "degR", "kelvin": "K", "kg_cat": "kg", "g_cat": "g", "kgcat": "kg", "gcat": "g",
    "lb_cat": "lb", "lbcat": "lb", "t_cat": "t",
}  # fmt: skip

STATE = (
    "{name} is a gas volume without its reference state (0, 15, 25 degC or 60 degF, 1 atm or 1 bar: they differ "
    "by up to 9 %): convert it to mol with the state that was meant"
)
MOLAR = "write mol/L, mmol/L or mol/m3 instead of {name}"

REFUSED: dict[str, str] = {
    "C": "write degC for Celsius (C alone is the coulomb)",
    "F": "write degF for Fahrenheit (F alone is the farad)",
    "R": "write degR for Rankine",
    "M": MOLAR, "mM": MOLAR, "uM": MOLAR, "µM": MOLAR, "μM": MOLAR, "nM": MOLAR,
    "%": "write the fraction without a unit: a cell formatted as % holds 0.05 for 5 %",
    "ppm": "write a concentration, or the fraction without a unit", "ppmv": "write a concentration",
    "percent": "write the fraction without a unit",
    "ton": "write t (1000 kg) or lb: a ton is a different mass in different places",
    "tons": "write t (1000 kg) or lb: a ton is a different mass in different places",
    "H": "write h for hours", "S": "write s for seconds", "Mol": "write mol", "MIN": "write min",
    "Min": "write min", "KG": "write kg", "Kg": "write kg", "Kmol": "write kmol", "KJ": "write kJ",
    "G": "write g for grams", "cst": "write mm2/s",
    **dict.fromkeys(
        ("Nm3", "Sm3", "NL", "Nl", "SL", "scf", "SCF", "MSCF", "MMSCF", "MMSCFD", "scfm", "SCFM", "scfh", "SCFH",
         "sccm", "slpm", "slm", "nlpm", "Ncm3", "Nm", "Sm", "sft3", "Sft3"), STATE,
    ),
}  # fmt: skip


def look_up(name: str) -> NamedUnit | None:
    """The unit of a name or of a prefix and a name; None where the table does not have it."""
    name = ALIASES.get(name, name)
    if name in PLAIN:
        factor, dims = PLAIN[name]
        return NamedUnit(name, factor, dims)
    if name in OFFSET:
        factor, dims, offset = OFFSET[name]
        return NamedUnit(name, factor, dims, offset)
    if name in PREFIXED:
        canonical, factor, dims, _ = PREFIXED[name]
        return NamedUnit(canonical, factor, dims)
    stem = PREFIXED.get(name[1:])
    if stem is not None and name[0] in stem[3]:
        prefix = "µ" if name[0] in "µμu" else name[0]
        return NamedUnit(prefix + stem[0], PREFIXES[name[0]] * stem[1], stem[2])
    return None


def known_names() -> list[str]:
    """Every name of the table that stands without a prefix, the usual ones with it too."""
    return [*PLAIN, *OFFSET, *PREFIXED, "kmol", "mmol", "kg", "mL", "kPa", "kJ", "MJ", "kcal", "kW", *ALIASES]
