"""Water that stays liquid in frozen soil: held by the grains (power law), kept thawed by salt, or both.

Both are written with the unfrozen water as the variable, as each then gives the temperature in closed form, and what
grains and salt do to the freezing point adds up.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from soiltemp.errors import InputError, message
from soiltemp.materials.tables import coefficients
from soiltemp.units import QuantityLike, to_si

__all__ = [
    "COLDEST",
    "SPECIFIC_SURFACE_LIMITS",
    "UnfrozenWater",
    "freezing_point_unesco_1983",
    "power_law_anderson_tice_1972",
    "read_power_law",
    "read_salinity",
]

Floats = NDArray[np.float64]

COLDEST = -20.0
"""Temperature below which no more water freezes [degC] (our choice): what is left then hardly changes with cold."""

SALINITY_LIMITS = (0.0, 0.04)
ALPHA_LIMITS = (1e-4, 5.0)
BETA_LIMITS = (-5.0, -0.05)
SPECIFIC_SURFACE_LIMITS = (10.0, 1e6)  # a coarse sand to montmorillonite and more [m2 kg-1]
_WATER_CONTENT_LIMITS = (1e-6, 33.0)  # the upper one as in `heat`

_LOWEST_POINT = COLDEST + 1.0  # degC; below it hardly any water is left to freeze
FREE_WATER_RANGE = 0.02
"""Range below 0 degC [K] over which water freezes that the grains hold no better (our choice, as for soil that freezes
at once): a power law, fitted to colder soil, would have it freeze within a hair of 0 degC."""

_LEAST_DEPRESSION = 1e-3  # K; with less salt all water freezes at once
_HALVINGS = 60  # of an interval of contents: beyond the last bit


def freezing_point_unesco_1983(salinity: QuantityLike) -> float:
    """Freezing point of water with sea salt in it, at the pressure of the air.

    Parameters
    ----------
    salinity : float or str
        Salt by mass of water with salt [kg/kg], 0 to 0.04: ``"35 g/kg"``.

    Returns
    -------
    float
        Freezing point [degC], 0 and below.

    Raises
    ------
    InputError, UnitError
        A salinity out of range.

    Notes
    -----
    ``-0.0575 S + 1.710523e-3 S^1.5 - 2.154996e-4 S^2``, S in g/kg.

    References
    ----------
    F. J. Millero, in UNESCO Technical Papers in Marine Science 28 (1978) and 44 (1983); coefficients from memory.

    Examples
    --------
    >>> round(freezing_point_unesco_1983("35 g/kg"), 2)
    -1.92
    """
    return float(_brine_freezing_point(np.array([read_salinity(salinity, "freezing point")]))[0]) + 0.0


def _brine_freezing_point(salinity: Floats) -> Floats:
    """Freezing point [degC] of brine of a salinity [kg/kg]; beyond 0.04 the formula is extrapolated."""
    c = coefficients("freezing_point_unesco_1983")
    grams = 1000.0 * salinity
    return np.asarray(-c["linear"] * grams + c["power_1_5"] * grams**1.5 - c["square"] * grams**2)


def power_law_anderson_tice_1972(specific_surface: QuantityLike) -> tuple[float, float]:
    """Power law of the unfrozen water of a soil from its specific surface, after Anderson and Tice.

    Parameters
    ----------
    specific_surface : float or str
        Surface of the grains by their mass [m2 kg-1], 10 to 1e6: silts have some 20 m2/g, clays 50 to 800.

    Returns
    -------
    alpha : float
        Unfrozen water 1 K below 0 degC [kg/kg].
    beta : float
        Exponent, below 0 [1].

    Raises
    ------
    InputError, UnitError
        A surface out of range.

    Notes
    -----
    ``ln w_u = 0.2618 + 0.5519 ln S - 1.449 S^-0.264 ln |T|``, w_u in percent by mass of grains, S in m2/g, T in degC.

    References
    ----------
    D. M. Anderson and A. R. Tice, Predicting unfrozen water contents in frozen soils from surface area measurements,
    Highway Research Record 393, 1972, pages 12-18; coefficients from memory.

    Examples
    --------
    >>> alpha, beta = power_law_anderson_tice_1972("84 m^2/g")
    >>> round(alpha, 3), round(beta, 3)
    (0.15, -0.45)
    """
    c = coefficients("power_law_anderson_tice_1972")
    low, high = SPECIFIC_SURFACE_LIMITS
    surface = to_si(specific_surface, "specific_surface", "specific surface", low=low, high=high) / 1000.0  # m2/g
    alpha = 0.01 * np.exp(c["constant"] + c["log_surface"] * np.log(surface))
    return float(alpha), float(-c["exponent"] * surface ** c["power_of_surface"])


@dataclass(frozen=True, init=False)
class UnfrozenWater:
    """Unfrozen water of a soil by temperature: a power law, salt, or both.

    Parameters
    ----------
    water_content : float or str
        All water, the salt in it included, by mass of grains [kg/kg], 1e-6 to 33.
    alpha, beta : float or str, optional
        Power law ``w_u = alpha |T|^beta`` [kg/kg, degC], alpha 1e-4 to 5, beta -5 to -0.05; both left out where the
        grains hold nothing back (sand, gravel).
    salinity : float or str, optional
        Salt by mass of the pore water, all of it thawed [kg/kg], 0 to 0.04.

    Raises
    ------
    InputError, UnitError
        A value out of range; neither grains nor salt that keep water liquid; a soil that does not freeze above -19
        degC, or salt alone that lowers its freezing point by less than 0.001 K.

    Notes
    -----
    The temperature at which w_u is left is ``T = -(w_u / alpha)^(1/beta) + T_f(S w / w_u)``: salt stays in the liquid,
    whose salinity grows as ice forms, and both depressions add up. Water beyond ``alpha 0.02^beta``, which the law
    would have freeze within 0.02 K of 0 degC, freezes evenly over that range. T_f is that of
    :func:`freezing_point_unesco_1983`, beyond 40 g/kg extrapolated: 0.9 K too warm for brine that freezes at -12 degC,
    4 K at -20 degC, beside the polynomial of G. F. N. Cox and W. F. Weeks for brine in sea ice (CRREL, 1980s; value
    from memory). Salts that crystallise below -8 degC are taken as staying dissolved.

    References
    ----------
    D. M. Anderson and A. R. Tice, Highway Research Record 393, 1972; A. Banin and D. M. Anderson, Water Resources
    Research 10, 1974, pages 124-128 (salt and grains add up); from memory.

    Examples
    --------
    >>> clay = UnfrozenWater(0.3, 0.15, -0.45)
    >>> round(clay.freezing_point, 2), clay.content([-1.0, -5.0]).round(3).tolist()
    (-0.21, [0.15, 0.073])
    """

    water_content: float
    alpha: float | None
    beta: float | None
    salinity: float

    def __init__(
        self,
        water_content: QuantityLike,
        alpha: QuantityLike | None = None,
        beta: QuantityLike | None = None,
        salinity: QuantityLike = 0.0,
    ) -> None:
        where = "unfrozen water"
        low, high = _WATER_CONTENT_LIMITS
        water = to_si(water_content, "fraction", f"{where}, water content", low=low, high=high)
        object.__setattr__(self, "water_content", water)
        law: tuple[float | None, float | None] = (None, None)
        if alpha is not None and beta is not None:
            law = read_power_law(alpha, beta, where)
        elif alpha is not None or beta is not None:
            found = f"{'alpha' if beta is None else 'beta'} alone"
            raise InputError(message(where, found, "alpha and beta, or neither", "state both"))
        object.__setattr__(self, "alpha", law[0])
        object.__setattr__(self, "beta", law[1])
        object.__setattr__(self, "salinity", read_salinity(salinity, where))
        self._check()

    def _check(self) -> None:
        if self.alpha is None and self.salinity == 0.0:
            remedy = 'give a power law or a salinity, or take the curve "linear" or "at once"'
            raise InputError(message("unfrozen water", "neither grains nor salt", "one of them", remedy))
        point = self.freezing_point
        found = f"a freezing point of {point:.3g} degC with {self.water_content:g} kg/kg of water"
        if point < _LOWEST_POINT:
            remedy = "check alpha, beta and the water content; for ground too dry to freeze give a material without "
            remedy += "latent heat"
            raise InputError(message("unfrozen water", found, f"{_LOWEST_POINT:g} degC or above", remedy))
        if self.alpha is None and point > -_LEAST_DEPRESSION:
            remedy = 'leave out so little salt, or take the curve "at once"'
            raise InputError(message("unfrozen water", found, f"{-_LEAST_DEPRESSION:g} degC or below", remedy))

    @property
    def freezing_point(self) -> float:
        """Temperature at which the first ice forms [degC]."""
        return float(self.temperature(self.water_content)) + 0.0

    @property
    def rest(self) -> float:
        """Water that never freezes: what is left at `COLDEST` [kg/kg]."""
        return float(self.content(COLDEST))

    @property
    def _held(self) -> float:
        """Water that the grains hold at the lower end of `FREE_WATER_RANGE` [kg/kg]; 0 where they hold none."""
        if self.alpha is None or self.beta is None:
            return 0.0
        return float(self.alpha * FREE_WATER_RANGE**self.beta)

    def temperature(self, content: ArrayLike) -> Floats:
        """Temperature at which so much water is left unfrozen.

        Parameters
        ----------
        content : float or array
            Unfrozen water [kg/kg], above 0.

        Returns
        -------
        numpy.ndarray
            Temperature, in the shape of `content` [degC].
        """
        left = np.asarray(content, dtype=np.float64)
        found = np.zeros(left.shape)
        if self.alpha is not None and self.beta is not None:
            held = min(self._held, self.water_content)
            depression = (np.minimum(left, held) / self.alpha) ** (1.0 / self.beta)
            if held < self.water_content:
                share = (self.water_content - left) / (self.water_content - held)
                depression = np.where(left > held, FREE_WATER_RANGE * share, depression)
            found = found - depression
        if self.salinity > 0.0:
            found = found + _brine_freezing_point(self.salinity * self.water_content / left)
        return np.asarray(found)

    def content(self, temperature: ArrayLike) -> Floats:
        """Unfrozen water at temperatures.

        Parameters
        ----------
        temperature : float or array
            Temperatures [degC].

        Returns
        -------
        numpy.ndarray
            Unfrozen water, in the shape of `temperature` [kg/kg]; below `COLDEST` that of `COLDEST`, NaN where the
            temperature is NaN.
        """
        at = np.asarray(temperature, dtype=np.float64)
        frozen = np.clip(at, COLDEST, self.freezing_point)
        if self.salinity == 0.0 and self.alpha is not None and self.beta is not None:
            cold = np.minimum(frozen, -FREE_WATER_RANGE if self._held < self.water_content else self.freezing_point)
            left = self.alpha * np.abs(cold) ** self.beta
            free = np.maximum(self.water_content - self._held, 0.0) * (
                1.0 + np.maximum(frozen, -FREE_WATER_RANGE) / FREE_WATER_RANGE
            )
            left = left + free
        else:
            low, high = np.full(at.shape, 1e-6 * self.water_content), np.full(at.shape, self.water_content)
            for _ in range(_HALVINGS):  # the temperature rises with the content
                middle = 0.5 * (low + high)
                warmer = self.temperature(middle) > frozen
                low, high = np.where(warmer, low, middle), np.where(warmer, middle, high)
            left = np.where(np.isnan(at), np.nan, high)
        return np.asarray(np.where(at >= self.freezing_point, self.water_content, left))


def read_power_law(alpha: QuantityLike, beta: QuantityLike, where: str) -> tuple[float, float]:
    """Alpha [kg/kg] and beta [1] of a power law, checked."""
    return (
        to_si(alpha, "fraction", f"{where}, unfrozen alpha", low=ALPHA_LIMITS[0], high=ALPHA_LIMITS[1]),
        to_si(beta, "fraction", f"{where}, unfrozen beta", low=BETA_LIMITS[0], high=BETA_LIMITS[1]),
    )


def read_salinity(salinity: QuantityLike, where: str) -> float:
    """Salinity of pore water [kg/kg], checked."""
    low, high = SALINITY_LIMITS
    return to_si(salinity, "fraction", f"{where}, salinity", low=low, high=high)
