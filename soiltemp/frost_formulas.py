"""Closed forms of frost depth for a profile: Stefan and modified Berggren over its layers, down to the last wet one."""

from __future__ import annotations

from soiltemp.closed_form import ModifiedBerggrenSteps, layered_modified_berggren_steps, layered_stefan_depth
from soiltemp.ground import Profile
from soiltemp.materials import Material

__all__ = ["modified_berggren_of", "stefan_of", "wet_layers"]


def wet_layers(profile: Profile) -> int:
    """Number of layers down to the last that holds water; below it these formulas know no end of the frost."""
    return max((n for n, layer in enumerate(profile.layers, 1) if layer.material.latent_heat > 0.0), default=0)


def _section(profile: Profile) -> tuple[list[float], list[Material]]:
    layers = profile.layers[: wet_layers(profile)]
    return [layer.thickness for layer in layers], [layer.material for layer in layers]


def stefan_of(profile: Profile, index: float) -> float:
    """Frost depth by Stefan's equation in layers [m]: frozen conductivity and latent heat.

    Parameters
    ----------
    profile : Profile
        The ground, with water in one layer at least.
    index : float
        Freezing index of the surface [K s].

    Returns
    -------
    float
        Depth [m].

    Raises
    ------
    InputError
        An index that freezes more than the layers that hold water.

    References
    ----------
    UFC 3-130-06 (TM 5-852-6, January 1988), chapter 3 (value from memory): partial freezing indices.

    Examples
    --------
    >>> from soiltemp import Layer, Material
    >>> ground = Profile([Layer(Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 100e6), 5.0)])
    >>> round(stefan_of(ground, 700 * 86400.0), 3), round((2 * 1.9 * 700 * 86400.0 / 100e6) ** 0.5, 3)
    (1.516, 1.516)
    """
    thickness, materials = _section(profile)
    frozen = [material.conductivity_frozen for material in materials]
    return layered_stefan_depth(thickness, frozen, [material.latent_heat for material in materials], index)


def modified_berggren_of(
    profile: Profile, index: float, *, season_length: float, mean_temperature: float
) -> ModifiedBerggrenSteps:
    """Frost depth by the modified Berggren equation in layers, means of frozen and thawed properties.

    Parameters
    ----------
    profile : Profile
        The ground, with water in one layer at least.
    index : float
        Freezing index of the surface [K s].
    season_length : float
        Length of the freezing season [s].
    mean_temperature : float
        Mean annual temperature of the surface [degC], above 0.

    Returns
    -------
    ModifiedBerggrenSteps
        With the depth [m] and lambda.

    Raises
    ------
    InputError
        As the equation says.

    References
    ----------
    UFC 3-130-06 (TM 5-852-6, January 1988), chapter 3; value from memory.

    Examples
    --------
    >>> from soiltemp import Layer, Material
    >>> ground = Profile([Layer(Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 100e6), 5.0)])
    >>> steps = modified_berggren_of(ground, 700 * 86400.0, season_length=120 * 86400.0, mean_temperature=6.0)
    >>> bool(0.6 < steps.depth / stefan_of(ground, 700 * 86400.0) < 0.9)
    True
    """
    thickness, materials = _section(profile)
    return layered_modified_berggren_steps(
        thickness,
        [0.5 * (material.conductivity_frozen + material.conductivity_thawed) for material in materials],
        [0.5 * (material.heat_capacity_frozen + material.heat_capacity_thawed) for material in materials],
        [material.latent_heat for material in materials],
        index,
        season_length=season_length,
        mean_temperature=mean_temperature,
    )
