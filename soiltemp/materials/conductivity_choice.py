"""Conductivity of a soil by the published model that is asked for, and as its water freezes."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from soiltemp.constants import DENSITY_WATER
from soiltemp.materials.conductivity import (
    conductivity_cote_konrad_2005,
    conductivity_johansen_1975,
    conductivity_kersten_1949,
)
from soiltemp.materials.tables import coefficients, number

if TYPE_CHECKING:
    from soiltemp.materials.soil import Soil

__all__ = ["CONDUCTIVITY_MODELS", "ConductivityEstimate", "conductivity_as_it_freezes", "conductivity_of"]

Floats = NDArray[np.float64]

_OF_PHASES = {"cote_konrad_2005": conductivity_cote_konrad_2005, "johansen_1975": conductivity_johansen_1975}
_OF_TWO_STATES = {"kersten_1949": conductivity_kersten_1949}

CONDUCTIVITY_MODELS = (*_OF_PHASES, *_OF_TWO_STATES)
"""Names of the conductivity models that a soil can be asked for."""


@dataclass(frozen=True)
class ConductivityEstimate:
    """What one published model says of one soil.

    Parameters
    ----------
    model : str
        Name of the model, one of :data:`CONDUCTIVITY_MODELS`.
    thawed, frozen : float
        Thermal conductivity [W m-1 K-1]; NaN where the model does not apply.
    reason : str
        Why it does not apply; empty where it does.
    """

    model: str
    thawed: float
    frozen: float
    reason: str = ""


def conductivity_of(soil: Soil, model: str, state: str, unfrozen: float = 0.0) -> float:
    """Conductivity of a soil by one published model.

    Parameters
    ----------
    soil : Soil
        The soil.
    model : str
        One of `CONDUCTIVITY_MODELS`.
    state : {"thawed", "frozen"}
        State of the pore water.
    unfrozen : float
        Water left unfrozen in the frozen soil, by mass of grains [kg/kg]; Kersten's equations know of none.

    Returns
    -------
    float
        Thermal conductivity [W m-1 K-1].

    Raises
    ------
    InputError
        A soil that the model does not apply to.
    """
    if model in _OF_TWO_STATES:
        return _OF_TWO_STATES[model](soil.dry_density, soil.water_content, grain=soil.grain, state=state)
    return _OF_PHASES[model](
        soil.dry_density,
        soil.water_content,
        grain=soil.grain,
        state=state,
        quartz_fraction=soil.quartz_fraction_used,
        grain_density=soil.grain_density,
        dry_conductivity=soil.dry_conductivity,
        unfrozen_water=unfrozen * soil.dry_density / DENSITY_WATER if state == "frozen" else 0.0,
    )


def conductivity_as_it_freezes(soil: Soil, model: str, rest: float) -> Callable[[Floats], Floats]:
    """Conductivity of a soil by its unfrozen water.

    Parameters
    ----------
    soil : Soil
        The soil.
    model : str
        One of `CONDUCTIVITY_MODELS`.
    rest : float
        Water that never freezes [kg/kg].

    Returns
    -------
    callable
        Conductivity [W m-1 K-1] for arrays of unfrozen water [kg/kg], `rest` to all.

    Raises
    ------
    InputError
        A soil that the model does not apply to.

    Notes
    -----
    With w_u unfrozen and i the share of the freezing water that is ice::

        k = k_frozen(w_u) + (1 - i) (k_thawed - k_frozen(w))

    k_frozen(w_u) is the published model of frozen soil, in which ice and water take part by their geometric mean. It
    ends, with all water liquid, at another value than the model of thawed soil, as the Kersten numbers of both states
    differ; that difference goes over as ice forms. Kersten's equations have two states only, between which k goes
    straight with i.
    """
    thawed = conductivity_of(soil, model, "thawed")
    most, least = (conductivity_of(soil, model, "frozen", content) for content in (rest, soil.water_content))
    freezes = soil.water_content - rest
    if model in _OF_TWO_STATES:
        return lambda content: most + (content - rest) / freezes * (thawed - most)
    # of both models only k_sat knows the unfrozen water, as a power, and the conductivity is linear in k_sat
    phases = coefficients("phases")
    ratio = number(phases["conductivity_water"]) / number(phases["conductivity_ice"])
    whole = 1.0 - ratio ** (freezes * soil.dry_density / DENSITY_WATER)

    def conductivity(content: Floats) -> Floats:
        melted = 1.0 - ratio ** ((content - rest) * soil.dry_density / DENSITY_WATER)
        frozen = most + melted / whole * (least - most)
        return np.asarray(frozen + (content - rest) / freezes * (thawed - least))

    return conductivity
