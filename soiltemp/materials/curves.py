"""A material as the solver sees it: enthalpy and conduction potential, piecewise linear in temperature.

Whatever freezes, and however, ends up as these two rising curves; nothing behind them knows of soils.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike, NDArray

from soiltemp.constants import DENSITY_ICE, DENSITY_WATER
from soiltemp.errors import InputError, message
from soiltemp.units import to_si

__all__ = ["Curves"]

Array = NDArray[np.float64]

_MOST_WATER = 1050.0
"""Most water in a unit volume [kg m-3]: pure water, and what a latent heat up to 3.4e8 J m-3 stands for."""


@dataclass(frozen=True)
class Curves:
    """Enthalpy, conduction potential and frozen share of one material, by temperature.

    The knots cut the temperature axis into segments; inside each both curves are straight. Segment 0 lies
    below the first knot, segment K above the last.

    Parameters
    ----------
    knots : tuple of float, shape (K,)
        Strictly increasing temperatures where a curve may bend [degC]. Empty for a material without freezing
        water.
    heat_capacity : tuple of float, shape (K + 1,)
        Slope of the enthalpy in each segment, latent heat included [J m-3 K-1]; above 0.
    conductivity : tuple of float, shape (K + 1,)
        Slope of the conduction potential in each segment: the thermal conductivity [W m-1 K-1]; above 0.
    frozen_share : tuple of float, shape (K,)
        Share of the water that freezes which is ice at each knot [1]: 1 at the first and below, 0 at the last
        and above, never rising in between, and linear between the knots.
    water : float, optional
        All water, liquid and ice, in a unit volume [kg m-3], 0 to 1050.
    unfrozen_rest : float, optional
        Part of it that stays liquid below the first knot [kg m-3], 0 to `water`.

    Raises
    ------
    InputError
        Lengths that do not fit, knots that do not increase, slopes that are not positive, shares that rise or
        do not run from 1 to 0.

    Notes
    -----
    H(T) = integral of the heat capacity and Theta(T) = integral of the conductivity (the Kirchhoff
    transform), both taken from 0 degC, where both are 0.

    Examples
    --------
    >>> curves = Curves(knots=(-1.0, 0.0), heat_capacity=(2e6, 82e6, 3e6), conductivity=(2.5, 2.0, 1.5),
    ...                 frozen_share=(1.0, 0.0))
    >>> float(curves.enthalpy(-1.0)), float(curves.conduction_potential(-3.0)), float(curves.frozen(-0.25))
    (-82000000.0, -7.0, 0.25)
    """

    knots: tuple[float, ...]
    heat_capacity: tuple[float, ...]
    conductivity: tuple[float, ...]
    frozen_share: tuple[float, ...]
    water: float = 0.0
    unfrozen_rest: float = 0.0

    def __post_init__(self) -> None:
        for name, kind in (
            ("knots", "temperature"),
            ("heat_capacity", "heat_capacity"),
            ("conductivity", "conductivity"),
            ("frozen_share", "fraction"),
        ):
            values = getattr(self, name)
            try:
                members = tuple(values)
            except TypeError as error:
                raise _refusal(f"curves, {name}", f"{values!r}", "a sequence of numbers", "give a tuple") from error
            label = name.replace("_", " ")
            numbers = tuple(to_si(v, kind, f"curves, {label} {i}") for i, v in enumerate(members))
            object.__setattr__(self, name, numbers)
        water = to_si(self.water, "density", "curves, water", low=0.0, high=_MOST_WATER)
        rest = to_si(self.unfrozen_rest, "density", "curves, unfrozen rest", low=0.0, high=water)
        object.__setattr__(self, "water", water)
        object.__setattr__(self, "unfrozen_rest", rest)
        self._check_shape()
        self._check_values()

    def _check_shape(self) -> None:
        count = len(self.knots)
        if count == 1:
            raise _refusal("curves, knots", "1 knot", "none, or 2 and more", "give both ends of the freezing range")
        for name, allowed in (
            ("frozen_share", count),
            ("heat_capacity", count + 1),
            ("conductivity", count + 1),
        ):
            found = len(getattr(self, name))
            if found != allowed:
                label = name.replace("_", " ")
                raise _refusal(
                    f"curves, {label}",
                    f"{found} values for {count} knots",
                    f"{allowed} values",
                    "give one slope for each segment and one share for each knot",
                )

    def _check_values(self) -> None:
        for i, (low, high) in enumerate(pairwise(self.knots)):
            if not low < high:
                found = f"{high:g} degC after {low:g} degC"
                raise _refusal(f"curves, knot {i + 1}", found, "rising knots", "sort them and drop double ones")
        for name in ("heat_capacity", "conductivity"):
            for i, slope in enumerate(getattr(self, name)):
                if not slope > 0.0:
                    label = f"curves, {name.replace('_', ' ')} {i}"
                    raise _refusal(label, f"{slope:g}", "above 0", "give a positive slope in every segment")
        share = self.frozen_share
        if share and (share[0] != 1.0 or share[-1] != 0.0):
            found = f"{share[0]:g} at the first knot and {share[-1]:g} at the last"
            raise _refusal(
                "curves, frozen share",
                found,
                "1 at the first, 0 at the last",
                "give the whole freezing range",
            )
        for i, (low, high) in enumerate(pairwise(share)):
            if high > low:
                found = f"{high:g} after {low:g}"
                raise _refusal(f"curves, frozen share {i + 1}", found, "shares that never rise", "sort the table")

    @cached_property
    def _knots(self) -> Array:
        return np.asarray(self.knots, dtype=np.float64)

    def _integral(self, slopes: tuple[float, ...], temperature: ArrayLike) -> Array:
        """Integral of the slopes from 0 degC to `temperature`."""
        at = np.asarray(temperature, dtype=np.float64)
        slope = np.asarray(slopes)
        if not self.knots:
            return np.asarray(slope[0] * at)
        value = np.asarray(self._knot_values(slopes))
        segment = np.searchsorted(self._knots, at, side="right")
        start = np.maximum(segment - 1, 0)
        return np.asarray(value[start] + slope[segment] * (at - self._knots[start]))

    def _knot_values(self, slopes: tuple[float, ...]) -> tuple[float, ...]:
        """Integral of the slopes from 0 degC to each knot, exactly 0 at a knot at 0 degC."""
        knots = self.knots
        rises = [slope * (high - low) for slope, low, high in zip(slopes[1:], knots, knots[1:], strict=False)]
        # the segment that holds 0 degC; its lower knot is number `below` (or there is none)
        below = sum(knot <= 0.0 for knot in knots) - 1
        values = [0.0] * len(knots)
        if below >= 0:
            values[below] = slopes[below + 1] * knots[below]
            for i in range(below, 0, -1):
                values[i - 1] = values[i] - rises[i - 1]
        if below + 1 < len(knots):
            values[below + 1] = slopes[below + 1] * knots[below + 1]
            for i in range(below + 1, len(knots) - 1):
                values[i + 1] = values[i] + rises[i]
        return tuple(values)

    def enthalpy(self, temperature: ArrayLike) -> Array:
        """Enthalpy above that at 0 degC [J m-3], latent heat included.

        Parameters
        ----------
        temperature : float or array
            Temperatures [degC].

        Returns
        -------
        numpy.ndarray
            Enthalpy, in the shape of `temperature` [J m-3]; NaN where the temperature is NaN.
        """
        return self._integral(self.heat_capacity, temperature)

    def conduction_potential(self, temperature: ArrayLike) -> Array:
        """Integral of the conductivity from 0 degC [W m-1].

        Parameters
        ----------
        temperature : float or array
            Temperatures [degC].

        Returns
        -------
        numpy.ndarray
            Conduction potential, in the shape of `temperature` [W m-1]; NaN where the temperature is NaN.
        """
        return self._integral(self.conductivity, temperature)

    def frozen(self, temperature: ArrayLike) -> Array:
        """Share of the water that freezes which is ice, 0 to 1.

        Parameters
        ----------
        temperature : float or array
            Temperatures [degC].

        Returns
        -------
        numpy.ndarray
            Share [1], in the shape of `temperature`; 0 everywhere without knots, NaN where the temperature is
            NaN.
        """
        at = np.asarray(temperature, dtype=np.float64)
        if not self.knots:
            return np.asarray(at * 0.0)
        return np.asarray(np.interp(at, self._knots, np.asarray(self.frozen_share)))

    def ice(self, temperature: ArrayLike) -> Array:
        """Volume of ice in a unit volume [m3 m-3].

        Parameters
        ----------
        temperature : float or array
            Temperatures [degC].

        Returns
        -------
        numpy.ndarray
            Volume, in the shape of `temperature`; 9 % more than that of the water it was. NaN where the temperature is
            NaN.
        """
        return np.asarray(self._ice_mass(temperature) / DENSITY_ICE)

    def unfrozen_water(self, temperature: ArrayLike) -> Array:
        """Volume of liquid water in a unit volume [m3 m-3].

        Parameters
        ----------
        temperature : float or array
            Temperatures [degC].

        Returns
        -------
        numpy.ndarray
            Volume, in the shape of `temperature`; NaN where the temperature is NaN.
        """
        return np.asarray((self.water - self._ice_mass(temperature)) / DENSITY_WATER)

    def _ice_mass(self, temperature: ArrayLike) -> Array:
        """Ice in a unit volume [kg m-3]."""
        return self.frozen(temperature) * (self.water - self.unfrozen_rest)

    def temperature_from_enthalpy(self, enthalpy: ArrayLike) -> Array:
        """Temperature at which the material holds `enthalpy`; the inverse of :meth:`enthalpy`.

        Parameters
        ----------
        enthalpy : float or array
            Enthalpy above that at 0 degC [J m-3].

        Returns
        -------
        numpy.ndarray
            Temperatures [degC], in the shape of `enthalpy`.
        """
        held = np.asarray(enthalpy, dtype=np.float64)
        slope = np.asarray(self.heat_capacity)
        if not self.knots:
            return np.asarray(held / slope[0])
        value = np.asarray(self._knot_values(self.heat_capacity))
        segment = np.searchsorted(value, held, side="right")
        start = np.maximum(segment - 1, 0)
        return np.asarray(self._knots[start] + (held - value[start]) / slope[segment])


def _refusal(where: str, found: str, allowed: str, remedy: str) -> InputError:
    return InputError(message(where, found, allowed, remedy))
