"""How a soil is said to freeze: one of four curves and the values that belong to it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from soiltemp.errors import InputError, message
from soiltemp.materials.composition import check_choice
from soiltemp.materials.properties import FREEZING_POINT_LIMITS, FREEZING_RANGE_LIMITS
from soiltemp.materials.tables import coefficients
from soiltemp.materials.unfrozen_water import (
    COLDEST,
    SPECIFIC_SURFACE_LIMITS,
    UnfrozenWater,
    power_law_anderson_tice_1972,
    read_power_law,
    read_salinity,
)
from soiltemp.units import to_si

__all__ = ["FREEZING_CURVES", "Freezing", "carried_over", "read_freezing"]

FREEZING_CURVES = ("linear", "at once", "power law", "anderson_tice_1972")
"""Names of the freezing curves that a soil can have."""

AT_ONCE = 0.02
"""Freezing range of soil that freezes at once [K] (our choice): narrow beside any temperature that matters, and wide
enough for the depth of the 0 degC line not to move in stairs."""

_LINEAR = (0.0, 0.5)
_BELONGS = {
    "linear": ("freezing_point", "freezing_range"),
    "at once": ("salinity",),
    "power law": ("unfrozen_alpha", "unfrozen_beta", "salinity"),
    "anderson_tice_1972": ("specific_surface", "salinity"),
}
_NEEDED = {"power law": ("unfrozen_alpha", "unfrozen_beta"), "anderson_tice_1972": ("specific_surface",)}


@dataclass(frozen=True, slots=True)
class Freezing:
    """Curve, freezing point [degC] and range [K], and what the curve is made of."""

    curve: str
    point: float
    width: float
    alpha: float | None = None
    beta: float | None = None
    specific_surface: float | None = None
    salinity: float = 0.0

    def text(self) -> str:
        """How the water freezes, with sources, for `Material.source`."""
        text = f"freezing: {self.curve}"
        if self.alpha is not None and self.beta is not None:
            text += f", unfrozen water {self.alpha:.4g} |T|^{self.beta:.4g} kg/kg"
        if self.specific_surface is not None:
            source = coefficients("power_law_anderson_tice_1972")["source"]
            text += f" of {self.specific_surface / 1000.0:g} m2/g ({source})"
        if self.salinity:
            source = coefficients("freezing_point_unesco_1983")["source"]
            text += f", salinity {1000.0 * self.salinity:g} g/kg ({source})"
        return text


def read_freezing(where: str, curve: str, water_content: float, *, salinity: Any, **given: Any) -> Freezing:
    """Read and check how a soil freezes.

    Parameters
    ----------
    where : str
        The soil, for messages.
    curve : str
        One of `FREEZING_CURVES`.
    water_content : float
        Water by mass of grains [kg/kg].
    salinity : float or str
        Salt by mass of the pore water [kg/kg], 0 where there is none.
    **given
        `freezing_point`, `freezing_range`, `unfrozen_alpha`, `unfrozen_beta`, `specific_surface`; None where they are
        not stated.

    Raises
    ------
    InputError, UnitError
        Values that belong to another curve, missing ones, or ones out of range.
    """
    check_choice(curve, FREEZING_CURVES, f"{where}, freezing curve")
    salt = read_salinity(salinity, where)
    stated = [name for name, value in given.items() if value is not None] + (["salinity"] if salt else [])
    _check_home(where, curve, stated)
    if curve == "linear":
        return _linear(where, given)
    if curve == "at once" and salt == 0.0:
        return Freezing(curve, 0.0, AT_ONCE)
    if not water_content > 0.0:
        found = f'no water for the curve "{curve}"'
        raise InputError(message(f"{where}, freezing curve", found, "a soil with water", 'take "linear"'))
    alpha, beta, surface = None, None, None
    if curve == "power law":
        alpha, beta = read_power_law(given["unfrozen_alpha"], given["unfrozen_beta"], where)
    elif curve == "anderson_tice_1972":
        low, high = SPECIFIC_SURFACE_LIMITS
        place = f"{where}, specific surface"
        surface = to_si(given["specific_surface"], "specific_surface", place, low=low, high=high)
        alpha, beta = power_law_anderson_tice_1972(surface)
    try:
        point = UnfrozenWater(water_content, alpha, beta, salt).freezing_point
    except InputError as error:
        raise InputError(f"{where}, {error}") from error
    return Freezing(curve, point, point - COLDEST, alpha, beta, surface, salt)


def carried_over(curve: str, changed: str) -> dict[str, None]:
    """Arguments of a soil that fall away when it is made anew, because its curve gives them or another one did.

    Parameters
    ----------
    curve, changed : str
        Freezing curve before and after; names that do not exist are refused later.
    """
    gives = {"freezing_point", "freezing_range"} if curve != "linear" else set()
    if curve == "anderson_tice_1972":
        gives |= {"unfrozen_alpha", "unfrozen_beta"}
    if changed != curve:
        gives |= set(_BELONGS.get(curve, ())) - set(_BELONGS.get(changed, ())) - {"salinity"}  # salt stays in the soil
    return dict.fromkeys(sorted(gives))


def _check_home(where: str, curve: str, stated: list[str]) -> None:
    """Refuse values that do not belong to a curve, and want those that it needs."""
    odd = [name for name in stated if name not in _BELONGS[curve]]
    if odd:
        article = "an" if odd[0].startswith("u") else "a"
        found = f'{article} {_words(odd[0])} beside the curve "{curve}"'
        allowed = " and ".join(_words(name) for name in _BELONGS[curve])
        homes = " or ".join(f'"{name}"' for name, members in _BELONGS.items() if odd[0] in members)
        remedy = f"take it out, or choose the freezing curve {homes}"
        raise InputError(message(f"{where}, freezing curve", found, allowed, remedy))
    missing = [_words(name) for name in _NEEDED.get(curve, ()) if name not in stated]
    if missing:
        found = f'no {" and no ".join(missing)} for the curve "{curve}"'
        raise InputError(message(f"{where}, freezing curve", found, "one", f"state the {' and the '.join(missing)}"))


def _words(name: str) -> str:
    return name.replace("_", " ")


def _linear(where: str, given: dict[str, Any]) -> Freezing:
    values = []
    limits = (FREEZING_POINT_LIMITS, FREEZING_RANGE_LIMITS)
    kinds = ("temperature", "temperature_difference")
    for name, usual, kind, (low, high) in zip(_BELONGS["linear"], _LINEAR, kinds, limits, strict=True):
        value = usual if given[name] is None else given[name]
        values.append(to_si(value, kind, f"{where}, {_words(name)}", low=low, high=high))
    return Freezing("linear", *values)
