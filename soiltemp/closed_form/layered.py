"""A periodic wave of temperature in layered ground, exact: 2x2 transfer matrices of complex amplitudes."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any, Literal, Protocol

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from soiltemp.closed_form.arguments import ArrayLike, LayersLike, as_given, read, read_layers, read_values
from soiltemp.errors import InputError, message
from soiltemp.units import QuantityLike

__all__ = [
    "layered_periodic",
    "layered_periodic_flux",
    "layered_periodic_flux_ratio",
    "layered_periodic_ratio",
]

State = Literal["thawed", "frozen"]


class LayeredGround(Protocol):
    """What is asked of a profile: `layers` top down, each with a `thickness` and a `material`."""

    @property
    def layers(self) -> tuple[Any, ...]: ...


def layered_periodic(
    profile: LayeredGround, period: QuantityLike, depths: ArrayLike, *, state: State = "thawed"
) -> Any:
    """Complex amplitude of temperature at each depth of a layered profile, relative to the surface.

    Exact for layers without freezing, by transfer matrices (Carslaw and Jaeger 1959). The base of the profile
    has a constant heat flux, as the column of the solver has: no part of the wave leaves there.

    Parameters
    ----------
    profile : Profile
        Layers top down.
    period : float, str or pint.Quantity
        Period of the wave [s].
    depths : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Depths below the surface [m], from 0 to the base of the profile.
    state : {"thawed", "frozen"}
        Whether the thawed or the frozen properties of the materials are used.

    Returns
    -------
    complex, numpy.ndarray or xarray.DataArray
        Ratio [1] in the shape of `depths`: its modulus is the ratio of amplitudes, minus its argument the lag
        of phase.

    Raises
    ------
    InputError, UnitError
        ``depth: found 12 m; allowed: 0 to 10 m, the base of the layers; ...``

    Notes
    -----
    Convention ``exp(+i omega t)``: surface ``Re(A exp(i omega t))``, at depth ``Re(A ratio exp(i omega t))``.
    In a uniform half space ``ratio = exp(-(1 + i) z / d)``. See :func:`layered_periodic_ratio` for the
    method.

    References
    ----------
    H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., Oxford 1959, section 3.7.

    Examples
    --------
    >>> from types import SimpleNamespace
    >>> board = SimpleNamespace(conductivity_thawed=0.036, heat_capacity_thawed=4e4)
    >>> sand = SimpleNamespace(conductivity_thawed=2.0, heat_capacity_thawed=2.5e6)
    >>> profile = SimpleNamespace(layers=(SimpleNamespace(thickness=0.4, material=sand),
    ...     SimpleNamespace(thickness=0.05, material=board), SimpleNamespace(thickness=20.0, material=sand)))
    >>> [round(float(abs(r)), 3) for r in layered_periodic(profile, "365 day", [0.4, 0.45, 2.0])]
    [0.92, 0.417, 0.241]
    """
    return _temperature(_wave(*_properties(profile, state), period, checked="material_heat_capacity"), depths)


def layered_periodic_flux(
    profile: LayeredGround, period: QuantityLike, depths: ArrayLike, *, state: State = "thawed"
) -> Any:
    """Complex amplitude of the downward heat flux at each depth for 1 K of amplitude at the surface.

    At depth 0 it is the thermal admittance of the ground seen from the surface. Method as
    :func:`layered_periodic`.

    Parameters
    ----------
    profile : Profile
        Layers top down.
    period : float, str or pint.Quantity
        Period of the wave [s].
    depths : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Depths below the surface [m], from 0 to the base of the profile.
    state : {"thawed", "frozen"}
        Whether the thawed or the frozen properties of the materials are used.

    Returns
    -------
    complex, numpy.ndarray or xarray.DataArray
        Heat flux, positive downward, per kelvin of the surface [W m-2 K-1]; its argument is the lead over the
        surface.

    Raises
    ------
    InputError, UnitError
        ``depth: found 12 m; allowed: 0 to 10 m, the base of the layers; ...``

    Notes
    -----
    In a uniform half space ``sqrt(i omega k C) exp(-(1 + i) z / d)``: the flux leads the temperature by 1/8
    period.

    References
    ----------
    H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., Oxford 1959, section 3.7.

    Examples
    --------
    >>> from types import SimpleNamespace
    >>> sand = SimpleNamespace(conductivity_frozen=2.9, heat_capacity_frozen=2.0e6)
    >>> profile = SimpleNamespace(layers=(SimpleNamespace(thickness=30.0, material=sand),))
    >>> admittance = layered_periodic_flux(profile, "365 day", 0.0, state="frozen")
    >>> round(abs(admittance), 3), round(float(np.angle(admittance, deg=True)), 1)
    (1.075, 45.0)
    """
    return _flux(_wave(*_properties(profile, state), period, checked="material_heat_capacity"), depths)


def layered_periodic_ratio(
    conductivity: LayersLike,
    heat_capacity: LayersLike,
    thickness: LayersLike,
    period: QuantityLike,
    depths: ArrayLike,
) -> Any:
    """Complex amplitude of temperature at each depth, relative to the surface, from lists of properties.

    Carslaw and Jaeger (1959), with each matrix divided by its growing exponential so that no product
    overflows.

    Parameters
    ----------
    conductivity : sequence
        Thermal conductivity of each layer, top down [W m-1 K-1], 0.001 to 500.
    heat_capacity : sequence
        Heat capacity of a volume of each layer [J m-3 K-1], 5e3 to 1e7.
    thickness : sequence
        Thickness of each layer [m], finite, 0.0001 and more.
    period : float, str or pint.Quantity
        Period of the wave [s].
    depths : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Depths below the surface [m], from 0 to the base of the last layer.

    Returns
    -------
    complex, numpy.ndarray or xarray.DataArray
        Ratio [1] in the shape of `depths`, in the convention ``exp(+i omega t)``.

    Raises
    ------
    InputError, UnitError
        ``layers: found 3 conductivities, 2 heat capacities and 3 thicknesses; ...``

    Notes
    -----
    With ``g = sqrt(i omega C / k)``, ``Y = k g`` and h the way down to the base of the layer, amplitudes of
    temperature and downward flux obey
    ``[T, q] = [[cosh gh, sinh gh / Y], [Y sinh gh, cosh gh]] [T, q]_base``. The flux is zero at the base of
    the last layer; going up gives ``q / T`` at each interface, going down the ratios.

    References
    ----------
    H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., Oxford 1959, section 3.7.

    Examples
    --------
    >>> r = layered_periodic_ratio([1.5, 0.036, 2.0], [3e6, 4e4, 2.5e6], [0.5, 0.05, 20.0], "365 day", "1 m")
    >>> round(abs(r), 4), round(-float(np.angle(r)) * 365 / (2 * np.pi), 1)
    (0.337, 41.0)
    """
    return _temperature(_wave(conductivity, heat_capacity, thickness, period), depths)


def layered_periodic_flux_ratio(
    conductivity: LayersLike,
    heat_capacity: LayersLike,
    thickness: LayersLike,
    period: QuantityLike,
    depths: ArrayLike,
) -> Any:
    """Complex amplitude of the downward heat flux at each depth for 1 K at the surface, from plain lists.

    Method as :func:`layered_periodic_ratio`.

    Parameters
    ----------
    conductivity, heat_capacity, thickness : sequence
        Properties of each layer, top down [W m-1 K-1], [J m-3 K-1], [m]; ranges as
        :func:`layered_periodic_ratio`.
    period : float, str or pint.Quantity
        Period of the wave [s].
    depths : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Depths below the surface [m], from 0 to the base of the last layer.

    Returns
    -------
    complex, numpy.ndarray or xarray.DataArray
        Heat flux, positive downward, per kelvin of the surface [W m-2 K-1], convention ``exp(+i omega t)``.

    Raises
    ------
    InputError, UnitError
        As :func:`layered_periodic_ratio`.

    Notes
    -----
    The second row of the matrices of :func:`layered_periodic_ratio`.

    References
    ----------
    H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., Oxford 1959, section 3.7.

    Examples
    --------
    >>> layered_periodic_flux_ratio([2.0], [2.5e6], [20.0], "365 day", 20.0)
    0j
    """
    return _flux(_wave(conductivity, heat_capacity, thickness, period), depths)


@dataclass(frozen=True, slots=True)
class _Wave:
    """The solved wave: for each layer its top, wave number and Y, and the wave at its ends."""

    interface: NDArray[np.float64]  # tops of the layers and the base [m]
    wave_number: NDArray[np.complex128]
    y: NDArray[np.complex128]
    base_admittance: NDArray[np.complex128]  # q / T at the base of each layer
    top_ratio: NDArray[np.complex128]  # T at the top of each layer, 1 at the surface


def _ends(wave_number: complex, y: complex, base: complex, above: Any, height: Any) -> tuple[Any, Any]:
    """T and q at a point of a layer, for T = 1 at its top and q = base * T at its base.

    The point is `above` the base and `height` below the top. Cosh and sinh are divided by the exponential
    that grows, so only decaying ones are left.
    """
    whole = above + height
    a = base / y
    one, one_top = np.exp(-2 * wave_number * above), np.exp(-2 * wave_number * whole)
    # expm1 keeps a thin layer's small sinh exact
    sinh, sinh_top = -np.expm1(-2 * wave_number * above), -np.expm1(-2 * wave_number * whole)
    scale = np.exp(-wave_number * height) / ((1 + one_top) + a * sinh_top)
    return scale * ((1 + one) + a * sinh), scale * y * (sinh + a * (1 + one))


def _wave(
    conductivity: Any,
    heat_capacity: Any,
    thickness: Any,
    period: Any,
    *,
    checked: str = "layer_heat_capacity",
) -> _Wave:
    k = read_layers(conductivity, "conductivity")
    c = read_layers(heat_capacity, checked)
    h = read_layers(thickness, "thickness")
    if not len(k) == len(c) == len(h):
        raise InputError(
            message(
                "layers",
                f"{len(k)} conductivities, {len(c)} heat capacities and {len(h)} thicknesses",
                "one of each for every layer",
                "make the lists equally long",
            )
        )
    angular = 2 * math.pi / read(period, "period")
    wave_number = np.sqrt(1j * angular * np.array(c) / np.array(k))
    y = np.array(k) * wave_number
    base_admittance = np.zeros(len(h), dtype=complex)
    for j in range(len(h) - 1, 0, -1):
        _, base_admittance[j - 1] = _ends(wave_number[j], y[j], base_admittance[j], h[j], 0.0)
    top_ratio = np.ones(len(h), dtype=complex)
    for j in range(len(h) - 1):
        through, _ = _ends(wave_number[j], y[j], base_admittance[j], 0.0, h[j])
        top_ratio[j + 1] = top_ratio[j] * through
    return _Wave(np.concatenate([[0.0], np.cumsum(h)]), wave_number, y, base_admittance, top_ratio)


def _at_depths(wave: _Wave, depths: Any) -> tuple[Any, Any]:
    """Ratios of temperature and of flux at `depths`, in the form of `depths`."""
    given = read_values(depths, "depth")
    z = np.asarray(given, dtype=float)
    base = wave.interface[-1]
    # a depth summed in another order than the layers may pass the base by rounding
    if np.max(z) > base * (1 + 1e-9):
        raise InputError(
            message(
                "depth",
                f"{np.max(z):.6g} m",
                f"0 to {base:.6g} m, the base of the layers",
                "make the last layer thicker or leave that depth out",
            )
        )
    z = np.minimum(z, base)
    layer = np.clip(np.searchsorted(wave.interface, z, side="left") - 1, 0, len(wave.y) - 1)
    temperature, flux = _ends(
        wave.wave_number[layer],
        wave.y[layer],
        wave.base_admittance[layer],
        wave.interface[layer + 1] - z,
        z - wave.interface[layer],
    )
    ratios = (wave.top_ratio[layer] * temperature, wave.top_ratio[layer] * flux)
    if isinstance(given, xr.DataArray):
        temperature, flux = (xr.DataArray(ratio, coords=given.coords, dims=given.dims) for ratio in ratios)
        return temperature, flux
    return ratios


def _temperature(wave: _Wave, depths: Any) -> Any:
    temperature, _ = _at_depths(wave, depths)
    return as_given(temperature, "temperature_ratio", "1", "complex amplitude of temperature relative to the surface")


def _flux(wave: _Wave, depths: Any) -> Any:
    _, flux = _at_depths(wave, depths)
    return as_given(flux, "heat_flux_ratio", "W m-2 K-1", "complex amplitude of downward heat flux for 1 K")


def _properties(profile: LayeredGround, state: str) -> tuple[list[Any], list[Any], list[Any]]:
    if state not in ("thawed", "frozen"):
        raise InputError(message("state", f"{state!r}", '"thawed" or "frozen"', "choose one of the two"))
    conductivity, heat_capacity, thickness = [], [], []
    try:
        for layer in profile.layers:
            conductivity.append(getattr(layer.material, f"conductivity_{state}"))
            heat_capacity.append(getattr(layer.material, f"heat_capacity_{state}"))
            thickness.append(layer.thickness)
    except AttributeError as error:
        raise InputError(
            message(
                f"profile, layer {len(thickness) + 1}",
                f"an object without {error.name}",
                "a Profile of layers with thickness and material",
                "build it as Profile([Layer(material, thickness), ...])",
            )
        ) from error
    return conductivity, heat_capacity, thickness
