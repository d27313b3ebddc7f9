"""Units: each unit text is compiled once to (scale, offset), with  SI value = scale * number + offset.

The worksheet units stand in a table, so that a workbook with plain numbers never loads pint; every other unit text is
compiled by pint, once. pint never touches a number of a calculation.
"""

from __future__ import annotations

import re
from functools import lru_cache

from .errors import InvalidInput

HOUR = 3600.0
YEAR = 365.25 * 24 * HOUR

#: worksheet unit -> (SI unit, scale, offset)
WORKSHEET_UNITS: dict[str, tuple[str, float, float]] = {
    "-": ("-", 1.0, 0.0),
    "L/(m²·h)": ("m/s", 1e-3 / HOUR, 0.0),
    "L/(m²·h·bar)": ("m/(s·Pa)", 1e-8 / HOUR, 0.0),
    "bar": ("Pa", 1e5, 0.0),
    "Pa": ("Pa", 1.0, 0.0),
    "mbar/min": ("Pa/s", 100.0 / 60, 0.0),
    "°C": ("K", 1.0, 273.15),
    "°C difference": ("K", 1.0, 0.0),
    "mPa·s": ("Pa·s", 1e-3, 0.0),
    "Pa·sⁿ": ("Pa·sⁿ", 1.0, 0.0),
    "kg/m³": ("kg/m³", 1.0, 0.0),
    "g/L": ("kg/m³", 1.0, 0.0),
    "g/g": ("-", 1.0, 0.0),
    "mol/L": ("mol/m³", 1e3, 0.0),
    "kDa": ("kg/mol", 1.0, 0.0),
    "mL/g": ("m³/kg", 1e-3, 0.0),
    "L/g": ("m³/kg", 1.0, 0.0),
    "L²/g²": ("m⁶/kg²", 1.0, 0.0),
    "mol·mL/g²": ("mol·m³/kg²", 1.0, 0.0),
    "mol·mL²/g³": ("mol·m⁶/kg³", 1e-3, 0.0),
    "bar/(g/L)": ("Pa·m³/kg", 1e5, 0.0),
    "bar/(g/L)²": ("Pa·m⁶/kg²", 1e5, 0.0),
    "bar/(g/L)³": ("Pa·m⁹/kg³", 1e5, 0.0),
    "bar/(g/L)ⁿ": ("Pa/(kg/m³)ⁿ", 1e5, 0.0),
    "nm": ("m", 1e-9, 0.0),
    "µm": ("m", 1e-6, 0.0),
    "mm": ("m", 1e-3, 0.0),
    "m": ("m", 1.0, 0.0),
    "m²": ("m²", 1.0, 0.0),
    "m³": ("m³", 1.0, 0.0),
    "L": ("m³", 1e-3, 0.0),
    "L/m²": ("m", 1e-3, 0.0),
    "m³/h": ("m³/s", 1.0 / HOUR, 0.0),
    "m/s": ("m/s", 1.0, 0.0),
    "m²/s": ("m²/s", 1.0, 0.0),
    "1/s": ("1/s", 1.0, 0.0),
    "1/m": ("1/m", 1.0, 0.0),
    "1/m²": ("1/m²", 1.0, 0.0),
    "m/kg": ("m/kg", 1.0, 0.0),
    "1/(m·h)": ("1/(m·s)", 1.0 / HOUR, 0.0),
    "s/L²": ("s/m⁶", 1e6, 0.0),
    "%/min": ("1/s", 0.01 / 60, 0.0),
    "s": ("s", 1.0, 0.0),
    "min": ("s", 60.0, 0.0),
    "h": ("s", HOUR, 0.0),
    "min/day": ("-", 1.0 / 1440, 0.0),
    "h/day": ("-", 1.0 / 24, 0.0),
    "1/day": ("1/s", 1.0 / (24 * HOUR), 0.0),
    "1/year": ("1/s", 1.0 / YEAR, 0.0),
    "year": ("s", YEAR, 0.0),
    "kW": ("W", 1e3, 0.0),
    "kWh/m³": ("J/m³", 3.6e6, 0.0),
    "kJ/(kg·K)": ("J/(kg·K)", 1e3, 0.0),
    "mN/m": ("N/m", 1e-3, 0.0),
    "deg": ("rad", 0.017453292519943295, 0.0),
    "g/m²": ("kg/m²", 1e-3, 0.0),
    "g·h/(L·year)": ("kg/m³", HOUR / YEAR, 0.0),
    "m³/year": ("m³/s", 1.0 / YEAR, 0.0),
    "money": ("money", 1.0, 0.0),
    "money/m²": ("money/m²", 1.0, 0.0),
    "money/m³": ("money/m³", 1.0, 0.0),
    "money/kWh": ("money/J", 1.0 / 3.6e6, 0.0),
    "money/year": ("money/s", 1.0 / YEAR, 0.0),
}

_INCH, _FOOT, _US_GALLON, _POUND_FORCE = 0.0254, 0.3048, 3.785411784e-3, 4.4482216152605  # exact by definition
_PSI, _GFD = _POUND_FORCE / _INCH**2, _US_GALLON / _FOOT**2 / (24 * HOUR)

#: The texts met most, in the same form, so that most workbooks never load pint.
COMMON_UNITS: dict[str, tuple[str, float, float]] = {
    "%": ("-", 0.01, 0.0),
    "LMH": ("m/s", 1e-3 / HOUR, 0.0),
    "gfd": ("m/s", _GFD, 0.0),
    "LMH/bar": ("m/(s·Pa)", 1e-8 / HOUR, 0.0),
    "gfd/psi": ("m/(s·Pa)", _GFD / _PSI, 0.0),
    "psi": ("Pa", _PSI, 0.0),
    "kPa": ("Pa", 1e3, 0.0),
    "MPa": ("Pa", 1e6, 0.0),
    "mbar": ("Pa", 100.0, 0.0),
    "cP": ("Pa·s", 1e-3, 0.0),
    "degC": ("K", 1.0, 273.15),
    "degF": ("K", 5 / 9, 459.67 * 5 / 9),
    "m3/h": ("m³/s", 1.0 / HOUR, 0.0),
    "gpm": ("m³/s", _US_GALLON / 60, 0.0),
    "m2": ("m²", 1.0, 0.0),
    "g/l": ("kg/m³", 1.0, 0.0),
    "mg/L": ("kg/m³", 1e-3, 0.0),
}

#: Spellings of the trade that pint does not know.
TRADE_DEFINITIONS = (
    "LMH = liter / meter**2 / hour = _ = lmh",
    "gfd = gallon / foot**2 / day = _ = GFD",
    "gpm = gallon / minute = _ = GPM",
    "gpd = gallon / day = _ = GPD",
    "MGD = 1e6 * gallon / day = _ = mgd",
    "MLD = 1e6 * liter / day",
    "LPM = liter / minute = _ = lpm",
    "cfm = foot**3 / minute = _ = CFM",
    "water_column = 9806.65 * pascal / meter",  # conventional
    "ppb = 1e-9",
    "money = [money]",
)

#: Spellings that pint takes for something else, or does not take. A dalton is a molar mass, never the mass of a molecule.
_OTHERWISE = {
    "Da": "(g/mol)", "kDa": "(kg/mol)", "MDa": "(Mg/mol)", "mil": "thou", "Å": "angstrom", "\u212b": "angstrom",
    "bbl": "oil_barrel", "barrel": "oil_barrel", "PSI": "psi", "KPA": "kPa", "BAR": "bar", "psid": "psi", "mPas": "mPa*s",
    "Pa.s": "Pa*s", "mPa.s": "mPa*s", "L/m2h": "L/m**2/h", "ºC": "degC", "℃": "degC", "℉": "degF", "Celsius": "degC",
    "Fahrenheit": "degF", "‰": "permille",
    **{f"{length}{water}": f"({length}*water_column)" for length in ("mm", "cm", "m", "in", "ft") for water in ("H2O", "WC")},
}
_OTHERWISE_FOUND = re.compile("|".join(rf"(?<![A-Za-z]){re.escape(k)}(?![A-Za-z])" for k in sorted(_OTHERWISE, key=len, reverse=True)))
_AMBIGUOUS = {"ton": "write t for 1000 kg, short_ton or long_ton", "tons": "write t for 1000 kg, short_ton or long_ton"}
#: Numbers that stand for themselves; every other unit without a dimension is an angle, a count or a constant.
_PURE = {"percent", "permille", "ppm", "ppb", "dimensionless"}
_ANGLES = {"degree", "radian", "arcminute", "arcsecond", "turn", "grade", "revolution"}
_TURNING = {"revolutions_per_minute", "revolutions_per_second"}

_PRESSURE = r"(?:k|m|M|h)?(?:Pa|bar|psi|atm)|kgf?/cm(?:2|²|\^2)"
_GAUGE = re.compile(rf"({_PRESSURE})\s*(?:g|\(g\)|gauge)", re.IGNORECASE)
_ABSOLUTE = re.compile(rf"({_PRESSURE})\s*(?:a|\(a\)|abs|absolute)", re.IGNORECASE)
_KILOGRAM_FORCE = re.compile(r"kgf?/cm(?:2|²|\^2)")
_SUPERSCRIPTS = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻", "0123456789-")
_SUPERSCRIPT_RUN = re.compile(r"⁻?[⁰¹²³⁴⁵⁶⁷⁸⁹]+")
_PLAIN_EXPONENT = re.compile(r"(?<=[A-Za-zµ°])(-?\d)(?![\dA-Za-z])")
#: One piece of a unit: nothing that a parser could take for code, no power of more than one digit.
_TOKEN = re.compile(r"[A-Za-zµΩ_]+|(?:\*\*|\^)-?\d(?!\d)|[*/()]|\s+|1(?=\s*/)")
_LONGEST = 60


def worksheet_unit(text: str) -> tuple[str, float, float]:
    """(SI unit, scale, offset) of a worksheet unit."""
    return WORKSHEET_UNITS[text]


@lru_cache(maxsize=4096)
def compile_unit(text: str, si_unit: str, absolute: bool = False, worksheet: str = "") -> tuple[float, float]:
    """(scale, offset) from a unit text to an SI unit.

    Parameters
    ----------
    text : str
        A unit as an engineer writes it: ``psi``, ``gfd``, ``L/(m²·h)``, ``m3/h``, ``degF``, ``%``.
    si_unit : str
        The SI unit wanted, as spelled in the table of worksheet units.
    absolute : bool
        Whether the quantity is an absolute pressure; all other pressures are gauge pressures or differences.
    worksheet : str
        The worksheet unit, for the reason of a refusal; where it is a difference, so is the text.

    Raises
    ------
    InvalidInput
        The unit is unknown, has another dimension, or is a gauge pressure where an absolute one is meant (or the reverse).
    """
    text = text.strip()
    difference = worksheet == "°C difference"
    if "ⁿ" in si_unit and text not in WORKSHEET_UNITS:
        raise InvalidInput(f"give a plain number in {worksheet or si_unit}: its unit depends on an exponent")
    if si_unit == "Pa":
        text = _pressure_reference(text, absolute)
    if si_unit == "K":
        text = _temperature(text)
    known = _known(text)
    if known is not None and known[0] == si_unit:
        return known[1], 0.0 if difference else known[2]
    scale, offset = _to_base(text)
    kind = "angle" if si_unit == "rad" else "number"
    if _dimension(text) != _dimension(si_unit) or _pure_kind(text) not in ("", kind):
        raise InvalidInput(f"the unit '{text[:40]}' does not fit; give a unit like '{worksheet or si_unit}'")
    if si_unit == "rad" and _pure_kind(text) != "angle":
        raise InvalidInput(f"the unit '{text[:40]}' is no angle; give degrees, for example '30 deg'")
    return scale / _to_base(si_unit)[0], 0.0 if difference else offset


def _known(text: str) -> tuple[str, float, float] | None:
    return WORKSHEET_UNITS.get(text) or COMMON_UNITS.get(text)


def convert(value: float, from_unit: str, to_unit: str) -> float:
    """A number in one unit, expressed in another of the same dimension.

    Gauge and absolute pressures are not mixed: the difference is the atmospheric pressure of the place. Nor are temperatures
    and temperature differences.

    Raises
    ------
    InvalidInput
        An unknown unit, unlike dimensions, or a gauge pressure asked for as an absolute one.
    """
    plain, references = zip(*map(_without_reference, (from_unit.strip(), to_unit.strip())))
    if set(references) == {"gauge", "absolute"}:
        raise InvalidInput(f"'{from_unit}' and '{to_unit}' differ by the atmospheric pressure; add or subtract it")
    plain = [_temperature(u) for u in plain]
    known = [_known(u) for u in plain]
    if None not in known and known[0][0] == known[1][0] and "°C difference" not in plain:
        return _converted(value, *known[0][1:], *known[1][1:])
    if any(_dimension_of_pressure(u) for u in plain):
        plain = [_KILOGRAM_FORCE.sub("kgf/cm**2", u) for u in plain]
    (scale_in, offset_in), (scale_out, offset_out) = map(_to_base, plain)
    if _dimension(plain[0]) != _dimension(plain[1]) or _pure_kind(plain[0]) != _pure_kind(plain[1]):
        raise InvalidInput(f"'{from_unit}' and '{to_unit}' measure different things")
    if (offset_in and _is_difference(plain[1])) or (offset_out and _is_difference(plain[0])):
        raise InvalidInput(f"of '{from_unit}' and '{to_unit}' one is a temperature, the other a difference of temperatures")
    return _converted(value, scale_in, offset_in, scale_out, offset_out)


def _converted(value: float, scale_in: float, offset_in: float, scale_out: float, offset_out: float) -> float:
    result = (scale_in * value + offset_in - offset_out) / scale_out
    # Zero points are far away on the kelvin scale: nine decimals of a temperature are all that a float holds of it.
    return round(result, 9) if offset_in or offset_out else result


_TEMPERATURES = {"C": "degC", "F": "degF"}


def _temperature(text: str) -> str:
    return _TEMPERATURES.get(text, text)


def _dimension_of_pressure(text: str) -> bool:
    return not _KILOGRAM_FORCE.fullmatch(text) and _dimension(text) == _dimension("Pa")


def _is_difference(text: str) -> bool:
    return "delta_" in str(_parsed(text))


@lru_cache(maxsize=4096)
def _pure_kind(text: str) -> str:
    """What a unit without a dimension, or a part of one, is: "angle", "number", "other"; "" where all parts have dimensions."""
    registry, unit = _registry(), _parsed(text)
    if _TURNING & set(unit._units):
        return "angle"
    bare = {name for name in unit._units if registry.Unit(name).dimensionless}
    if not bare:
        return "number" if unit.dimensionless else ""
    return "angle" if bare <= _ANGLES else "number" if bare <= _PURE else "other"


def known_unit(text: str) -> None:
    """Refuse what is no unit.

    Raises
    ------
    InvalidInput
        An unknown unit.
    """
    plain = _temperature(_without_reference(text.strip())[0])
    if _known(plain) is None:
        _to_base(plain)


def _without_reference(text: str) -> tuple[str, str]:
    """A pressure unit without its mark, and what the mark says: "gauge", "absolute", or nothing."""
    for pattern, reference in ((_GAUGE, "gauge"), (_ABSOLUTE, "absolute")):
        if found := pattern.fullmatch(text):
            return found[1], reference
    return text, ""


def _pressure_reference(text: str, absolute: bool) -> str:
    plain, reference = _without_reference(text)
    if text == "mPa":
        raise InvalidInput("'mPa' is a millipascal; did you mean MPa?")
    if absolute and (reference == "gauge" or text == "psid"):
        raise InvalidInput(f"'{text}' is a gauge pressure; give an absolute pressure, for example '1.013 bara'")
    if not absolute and reference == "absolute":
        raise InvalidInput(f"'{text}' is an absolute pressure; give a gauge pressure or a difference, for example '2 barg'")
    return _KILOGRAM_FORCE.sub("kgf/cm**2", plain)


def _plain(text: str) -> str:
    """A unit text in the spelling that pint reads."""
    if text in ("", "-", "–"):
        return "dimensionless"
    text = text.replace("μ", "µ").replace("°C difference", "delta_degC").replace("°", "deg").replace("%", "percent")
    text = _OTHERWISE_FOUND.sub(lambda m: _OTHERWISE[m[0]], text)
    text = _SUPERSCRIPT_RUN.sub(lambda m: f"**{m[0].translate(_SUPERSCRIPTS)}", text)
    text = text.replace("·", "*").replace("×", "*").replace("−", "-")
    return _PLAIN_EXPONENT.sub(r"**\1", text)


@lru_cache(maxsize=1)
def _registry():
    import pint  # slow to load, and needed for unit texts only

    registry = pint.UnitRegistry(on_redefinition="ignore")
    for line in TRADE_DEFINITIONS:
        registry.define(line)
    return registry


@lru_cache(maxsize=4096)
def _parsed(text: str):
    """pint's unit for a text; every way in which pint refuses a text is one InvalidInput."""
    import pint

    if text in _AMBIGUOUS:
        raise InvalidInput(f"'{text}' has several meanings; {_AMBIGUOUS[text]}")
    if not _is_unit(text):
        raise InvalidInput(f"'{text[:40]}' is not a unit")
    try:
        return _registry().Unit(_plain(text))
    except Exception as error:  # pint's parser raises many kinds, AttributeError and TokenError among them
        if isinstance(error, pint.UndefinedUnitError):
            raise InvalidInput(f"the unit '{text[:40]}' is unknown") from None
        raise InvalidInput(f"'{text[:40]}' is not a unit") from None


def _is_unit(text: str) -> bool:
    """Whether a text is made of the pieces of a unit: read in one pass, so that no text takes long."""
    if len(text) > _LONGEST:
        return False
    plain, at, power = _plain(text), 0, False
    while at < len(plain):
        token = _TOKEN.match(plain, at)
        if token is None:
            return False
        is_power = token[0].startswith(("**", "^"))
        if is_power and power:
            return False  # a tower of powers
        at, power = token.end(), is_power
    return True


@lru_cache(maxsize=4096)
def _to_base(text: str) -> tuple[float, float]:
    registry, unit = _registry(), _parsed(text)
    try:
        zero, one, two = (registry.Quantity(x, unit).to_base_units().magnitude for x in (0.0, 1.0, 2.0))
        if abs(two - 2 * one + zero) > 1e-9 * abs(two):
            raise ValueError("not linear")
    except Exception:  # offset units inside a product, logarithmic units: nothing a cell can mean
        raise InvalidInput(f"the unit '{text[:40]}' cannot be converted by a factor") from None
    return one - zero, zero


@lru_cache(maxsize=4096)
def _dimension(text: str):
    return _parsed(text).dimensionality
