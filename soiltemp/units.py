"""Quantities read at the door: "4 ft", "110 lb/ft^3", "-10 degF", "2500 degF day" become SI floats.

Inside soiltemp every number is SI (temperatures in degC). A *kind* says what a quantity is; a temperature and
a difference of temperatures are different kinds and are never converted into each other. The unit arithmetic
is pint's.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from fractions import Fraction
from functools import cache, lru_cache
from numbers import Real
from tokenize import TokenError
from typing import TYPE_CHECKING, Any, Protocol

from soiltemp.errors import InputError, UnitError, message

if TYPE_CHECKING:
    from pint import UnitRegistry

__all__ = ["KINDS", "Kind", "QuantityLike", "from_si", "to_si"]

ABSOLUTE_ZERO = -273.15  # degC, by definition of the Celsius scale (SI Brochure, 9th ed., 2.3.1)


class _WithUnits(Protocol):
    """What a pint quantity shows of itself; naming pint here would import it."""

    @property
    def magnitude(self) -> Any: ...

    @property
    def units(self) -> Any: ...


QuantityLike = float | str | _WithUnits
"""What :func:`to_si` reads: a float in SI, a string with its unit, or a pint quantity."""


@dataclass(frozen=True, slots=True)
class Kind:
    """A kind of quantity: the unit it has inside soiltemp, and how a user may write it."""

    name: str
    si_unit: str
    us_unit: str
    example: str


KINDS: dict[str, Kind] = {
    kind.name: kind
    for kind in (
        Kind("temperature", "degC", "degF", '"-10 degC" or "14 degF"'),
        Kind("temperature_difference", "K", "delta_degF", '"17 K" or "30 delta_degF"'),
        Kind("length", "m", "ft", '"1.2 m" or "4 ft"'),
        Kind("density", "kg/m^3", "lb/ft^3", '"1600 kg/m^3" or "100 lb/ft^3"'),
        Kind("conductivity", "W/(m K)", "BTU/(hour ft delta_degF)", '"1.5 W/(m K)" or "0.9 BTU/(hour ft degF)"'),
        Kind("resistance", "m^2 K/W", "hour ft^2 delta_degF/BTU", '"1.5 m^2 K/W" or "9 hour ft^2 degF/BTU"'),
        Kind(
            "heat_transfer_coefficient",
            "W/(m^2 K)",
            "BTU/(hour ft^2 delta_degF)",
            '"25 W/(m^2 K)" or "4.4 BTU/(hour ft^2 degF)"',
        ),
        Kind("heat_capacity", "J/(m^3 K)", "BTU/(ft^3 delta_degF)", '"2.5 MJ/(m^3 K)" or "37 BTU/(ft^3 degF)"'),
        Kind("specific_heat", "J/(kg K)", "BTU/(lb delta_degF)", '"850 J/(kg K)" or "0.2 BTU/(lb degF)"'),
        Kind("latent_heat", "J/m^3", "BTU/ft^3", '"80 MJ/m^3" or "2160 BTU/ft^3"'),
        Kind("diffusivity", "m^2/s", "ft^2/hour", '"0.7e-6 m^2/s" or "0.027 ft^2/hour"'),
        Kind("heat_flux", "W/m^2", "BTU/(hour ft^2)", '"0.06 W/m^2" or "0.02 BTU/(hour ft^2)"'),
        Kind("time", "s", "day", '"1 hour" or "90 days"'),
        Kind("specific_surface", "m^2/kg", "ft^2/lb", '"60 m^2/g"'),
        Kind("speed", "m/s", "mph", '"5 m/s" or "11 mph"'),
        Kind("freezing_index", "K s", "delta_degF day", '"800 K day" or "1440 degF day"'),
        Kind("fraction", "1", "1", '"0.24" or "24 %"'),
        Kind("angle", "degree", "degree", '"47.2 degree"'),
    )
}

_NUMBER = re.compile(r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*(.*?)\s*", re.DOTALL | re.ASCII)

# Only text of this form reaches pint, whose parser lets tokenizer errors and assertions through for other
# text and would work out powers such as 10^999999999: names, single-digit exponents, products, quotients,
# brackets.
_UNIT_NAME = r"[A-Za-z_µμ°Δ%]+(?:\s*(?:\^|\*\*)\s*(?:-?[1-9]|\(-?[1-9]\)))?"
_UNIT = re.compile(rf"(?:1\s*/)?[\s(]*{_UNIT_NAME}(?:[\s*/()]+{_UNIT_NAME})*[\s)]*")
_LONGEST_UNIT = 80

_SPELLINGS = str.maketrans({"℃": "°C", "℉": "°F", "²": "^2", "³": "^3", "·": " ", "−": "-", "\N{NO-BREAK SPACE}": " "})
_CF_EXPONENT = re.compile(r"(?<=[A-Za-z])(-?[1-9])(?![A-Za-z0-9])")  # "W m-1 K-1", "kg/m3"
_MISREAD = {"C": "the coulomb", "F": "the farad"}

# what comes out of pint, besides its own errors, for text and units that it cannot work with
_PINT_REFUSALS = (
    ArithmeticError,
    AssertionError,
    AttributeError,
    KeyError,
    RecursionError,
    SyntaxError,
    TokenError,
    TypeError,
    ValueError,
)


@cache
def _registry() -> UnitRegistry[Any]:
    # pint is imported on first use: it costs a third of a second and `import soiltemp` must stay light.
    import pint

    # Exact fractions, so that "32 degF" is 0 degC and not 6e-14 degC, which would be above a freezing point
    # of 0.
    registry: UnitRegistry[Any] = pint.UnitRegistry(non_int_type=Fraction)
    registry.define("pcf = pound / foot ** 3")
    return registry


def _shown(text: str) -> str:
    """`text` on one line and at most 60 characters long, fit for a message."""
    flat = "".join(letter if letter.isprintable() else " " for letter in text)
    return flat if len(flat) <= 60 else f"{flat[:57]}..."


@lru_cache(maxsize=512)
def _parse_unit(text: str) -> Any:
    """Unit of `text`, degrees inside a compound unit being differences; ValueError if it is none."""
    import pint

    clean = _CF_EXPONENT.sub(r"^\1", text.translate(_SPELLINGS))
    clean = clean.replace("°C", "degC").replace("°F", "degF")
    if clean and (len(clean) > _LONGEST_UNIT or _UNIT.fullmatch(clean) is None):
        raise ValueError(text)
    try:
        return _registry().parse_units(clean)
    except (pint.PintError, *_PINT_REFUSALS) as error:
        raise ValueError(text) from error


def _unit_error(name: str, found: str, kind: Kind) -> UnitError:
    article = "an" if kind.name[0] in "aeiou" else "a"
    allowed = f"{article} {kind.name.replace('_', ' ')} [{kind.si_unit}]"
    return UnitError(message(name, found, allowed, f"write it as {kind.example}"))


def _unit_of_kind(unit_text: str, kind: Kind, name: str, shown: str) -> Any:
    """Parse `unit_text`; refuse a unit that cannot measure `kind`, as far as pint lets it pass."""
    try:
        unit = _parse_unit(unit_text)
    except ValueError as error:
        raise _unit_error(name, f"{shown}, whose unit is unknown", kind) from error
    registry = _registry()
    is_scale = unit in (registry.degC, registry.degF)
    if kind.name == "temperature" and not is_scale and unit != registry.kelvin:
        if unit_text in _MISREAD:
            raise _unit_error(name, f"{shown}, where {unit_text} is {_MISREAD[unit_text]}", kind)
        is_difference = unit in (registry.delta_degC, registry.delta_degF)
        raise _unit_error(name, f"{shown}, a difference of temperatures" if is_difference else shown, kind)
    if kind.name == "temperature_difference" and is_scale:
        raise _unit_error(name, f"{shown}, a point on the temperature scale and not a difference", kind)
    return unit


@lru_cache(maxsize=512)
def _factor(unit: Any, si_unit: str) -> Fraction:
    """SI units in one `unit`; raises what pint raises, and ValueError for what is no plain multiple."""
    registry = _registry()
    target = _parse_unit(si_unit if si_unit != "1" else "")
    factor = registry.Quantity(Fraction(1), unit).to(target).magnitude
    # pint counts angles, bits and logarithms as plain numbers: "5 degree" or "3 dB" is no fraction
    if si_unit == "1" and registry.Quantity(Fraction(1), unit).to_root_units().units != target:
        raise ValueError(f"{unit}")
    return Fraction(factor)


def _convert(number: float, unit_text: str, kind: Kind, name: str, shown: str) -> float:
    """Convert `number` in the unit named by `unit_text` to the SI unit of `kind`."""
    import pint

    unit = _unit_of_kind(unit_text, kind, name, shown)
    if not math.isfinite(number):
        return number
    try:
        if kind.name == "temperature":
            return float(_registry().Quantity(Fraction(number), unit).to(_registry().degC).magnitude)
        return float(Fraction(number) * _factor(unit, kind.si_unit))
    except OverflowError:
        return math.inf
    except (pint.PintError, *_PINT_REFUSALS) as error:
        raise _unit_error(name, shown, kind) from error


def to_si(
    value: QuantityLike,
    kind: str,
    name: str,
    *,
    low: float | None = None,
    high: float | None = None,
    bare: str = "si",
) -> float:
    """Read one quantity: a float in SI, a string with its unit, or a pint quantity.

    Parameters
    ----------
    value : float, int, str or pint.Quantity
        What the user gave. A string must carry its unit (a `fraction` may go without). Units are written as
        pint knows them, in the form of CF files ("W m-1 K-1"), or with raised digits ("kg/m³").
    kind : str
        Key of :data:`KINDS`.
    name : str
        How to call the quantity in a message: ``'layer 2 "sand", thickness'``.
    low, high : float, optional
        Least and greatest value allowed, in the SI unit of the kind, bounds included.
    bare : {"si", "refuse"}
        Whether a bare number is taken as SI, or refused (as in a site file, where units are always written).

    Returns
    -------
    float
        The value in the SI unit of the kind (temperatures in degC).

    Raises
    ------
    UnitError
        Unit missing, unknown or of another kind.
    InputError
        Not a number, not finite, or outside `low` to `high`.

    Examples
    --------
    >>> round(to_si("4 ft", "length", "cover"), 4)
    1.2192
    >>> round(to_si("-10 degF", "temperature", "surface"), 3)
    -23.333
    >>> round(to_si("0.9 BTU/(hour ft degF)", "conductivity", "k"), 3)
    1.558
    >>> to_si("2500 degF day", "freezing_index", "index")  # 2500 / 1.8 * 86400
    120000000.0
    """
    rule = KINDS[kind]
    number, unit_text, shown = _split(value, rule, name)
    if unit_text is None:
        if bare == "refuse" and kind != "fraction":
            raise _unit_error(name, f"the bare number {number:g}", rule)
        result = number
    elif unit_text == "" and kind != "fraction":
        raise _unit_error(name, f"{shown}, a number without a unit", rule)
    else:
        result = _convert(number, unit_text, rule, name, shown)
    unit_shown = "" if rule.si_unit == "1" else f" {rule.si_unit}"
    if not math.isfinite(result):
        raise InputError(message(name, shown, f"a finite number{unit_shown and ' in' + unit_shown}", "correct it"))
    if kind == "temperature" and result < ABSOLUTE_ZERO:
        raise InputError(
            message(name, f"{result:g} degC", f"{ABSOLUTE_ZERO} degC (absolute zero) and above", "check the unit")
        )
    if (low is not None and result < low) or (high is not None and result > high):
        if high is None:
            allowed = f"{low:g}{unit_shown} or more"
        elif low is None:
            allowed = f"{high:g}{unit_shown} or less"
        else:
            allowed = f"{low:g} to {high:g}{unit_shown}"
        raise InputError(message(name, f"{result:.6g}{unit_shown}", allowed, "check the value and its unit"))
    return result


def _split(value: Any, rule: Kind, name: str) -> tuple[float, str | None, str]:
    """Number, unit text and a form for messages of `value`; the unit is None for a bare number."""
    if isinstance(value, str):
        shown = f'"{_shown(value)}"'
        match = _NUMBER.fullmatch(value.replace("−", "-"))
        if match is None or match.group(2).startswith(","):
            comma = ", with a decimal comma" if match else ""
            a_unit = f" with a unit of {rule.si_unit}" if rule.si_unit != "1" else ""
            raise InputError(message(name, shown + comma, f"a number{a_unit}", f"write it as {rule.example}"))
        return float(match.group(1)), match.group(2), shown
    if hasattr(value, "magnitude") and hasattr(value, "units"):
        unit_text = "" if f"{value.units}" in ("dimensionless", "") else f"{value.units:D}"
        number = _real(value.magnitude)
        if number is None:
            a_kind = f"one {rule.name.replace('_', ' ')}"
            raise InputError(message(name, _found(value.magnitude), a_kind, "give a single real number and its unit"))
        return number, unit_text, f'"{number:g} {unit_text}"'
    number = _real(value)
    if number is None:
        raise InputError(message(name, _found(value), f"a number in {rule.si_unit}", f"write it as {rule.example}"))
    return number, None, f"{number:g}"


def _real(value: Any) -> float | None:
    """One real number as a float; None for a truth value, a complex number, an array, a date and so on."""
    dtype = getattr(value, "dtype", None)
    if dtype is not None:
        # numpy calls its time spans integers, and its truth values convert to 1.0
        is_real = getattr(dtype, "kind", "") in ("f", "i", "u") and getattr(value, "ndim", 1) == 0
    else:
        is_real = isinstance(value, Real) and not isinstance(value, bool)
    if not is_real:
        return None
    try:
        return float(value)
    except OverflowError:
        return math.inf if value > 0 else -math.inf


def _found(value: Any) -> str:
    """What was given in place of a number."""
    return "nothing" if value is None else f"{type(value).__name__} {_shown(str(value))!r}"


def from_si(value: float, kind: str, unit: str) -> float:
    """Convert a float in the SI unit of `kind` to `unit`.

    Parameters
    ----------
    value : float
        Value in the SI unit of the kind (temperatures in degC); NaN and infinity pass through.
    kind : str
        Key of :data:`KINDS`.
    unit : str
        Unit wanted, as a user would write it.

    Returns
    -------
    float
        The value in `unit`.

    Raises
    ------
    UnitError
        If `unit` is not a unit of this kind.

    Examples
    --------
    >>> from_si(1.2192, "length", "ft")
    4.0
    """
    import pint

    rule = KINDS[kind]
    shown = f'"{_shown(unit)}"'
    target = _unit_of_kind(unit, rule, "output unit", shown)
    if not math.isfinite(value):
        return float(value)
    try:
        if kind == "temperature":
            return float(_registry().Quantity(Fraction(value), _registry().degC).to(target).magnitude)
        return float(Fraction(value) / _factor(target, rule.si_unit))
    except (pint.PintError, *_PINT_REFUSALS) as error:
        raise _unit_error("output unit", shown, rule) from error
