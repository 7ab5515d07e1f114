"""Soils that freeze by a smooth curve, and that curve written a second time, in the units of its sources."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.integrate import cumulative_trapezoid
from scipy.interpolate import CubicSpline

from soiltemp import Soil
from soiltemp.materials import (
    conductivity_cote_konrad_2005,
    conductivity_johansen_1975,
    conductivity_kersten_1949,
)

LATENT, WATER, ICE = 333.55e3, 4200.0, 2090.0  # soiltemp.constants, said again: J/kg, J/(kg K), J/(kg K)
COLDEST = -20.0

MODELS: dict[str, Callable[..., float]] = {
    "johansen_1975": conductivity_johansen_1975,
    "cote_konrad_2005": conductivity_cote_konrad_2005,
    "kersten_1949": conductivity_kersten_1949,
}
KINDS = ("power law", "power law, salt", "anderson_tice_1972", "anderson_tice_1972, salt", "at once, salt")


def random_soil(seed: int) -> tuple[Soil, str]:
    """A soil with a smooth freezing curve, and a conductivity model that applies to it; 15 seeds have all pairs."""
    kind, model = KINDS[seed % len(KINDS)], list(MODELS)[seed // len(KINDS) % len(MODELS)]
    rng = np.random.default_rng(seed)
    grain = str(rng.choice(["fine", "coarse"] if model == "kersten_1949" else ["fine", "coarse", "organic"]))
    dry = rng.uniform(100.0, 500.0) if grain == "organic" else rng.uniform(1100.0, 1900.0)
    greatest = 1000.0 / dry - 1000.0 / (1300.0 if grain == "organic" else 2700.0)
    water = max(0.08, greatest * rng.uniform(0.3, 1.0))
    values: dict[str, Any] = {"freezing_curve": kind.removesuffix(", salt")}
    # alpha from the freezing point, so that none of these soils is too dry to freeze
    if kind.startswith("power law"):
        beta, point = -rng.uniform(0.2, 1.2), 10.0 ** rng.uniform(-1.5, 0.5)
        values |= {"unfrozen_alpha": min(water * point**-beta, 5.0), "unfrozen_beta": beta}
    elif kind.startswith("anderson"):
        values["specific_surface"] = f"{10.0 ** rng.uniform(0.5, 1.9)} m^2/g"
    if kind.endswith("salt"):
        values["salinity"] = f"{rng.uniform(0.2, 40.0)} g/kg"
    return Soil(dry, water, grain, **values), model


@dataclass(frozen=True)
class Smooth:
    """The smooth curve at many points, from the freezing point down to -20 degC."""

    celsius: np.ndarray
    unfrozen: np.ndarray  # kg/kg
    conductivity: np.ndarray
    sensible: np.ndarray  # heat capacity without latent heat, J/(m3 K)

    def enthalpy_below(self, soil: Soil) -> np.ndarray:
        """Enthalpy less that at the freezing point [J/m3]."""
        latent = LATENT * soil.dry_density * (soil.water_content - self.unfrozen)
        return np.asarray(cumulative_trapezoid(self.sensible, self.celsius, initial=0.0) - latent)

    def potential_below(self) -> np.ndarray:
        """Conduction potential less that at the freezing point [W/m]."""
        return np.asarray(cumulative_trapezoid(self.conductivity, self.celsius, initial=0.0))


def temperature_of(soil: Soil, unfrozen: np.ndarray | float) -> np.ndarray:
    """Temperature [degC] at which so much water [kg/kg] is left, by percent and grams as the sources have it."""
    percent = 100.0 * np.asarray(unfrozen)
    celsius = np.zeros(percent.shape)
    if soil.unfrozen_alpha is not None:
        celsius = -np.exp(np.log(percent / (100.0 * soil.unfrozen_alpha)) / soil.unfrozen_beta)
        held, water = 100.0 * soil.unfrozen_alpha * 0.02**soil.unfrozen_beta, 100.0 * soil.water_content
        if held < water:  # what grains hold no better than 0.02 K freezes evenly from 0 degC to there
            celsius = np.where(percent > held, -0.02 * (water - percent) / (water - held), celsius)
    brine = 1000.0 * soil.salinity * soil.water_content / np.asarray(unfrozen)
    return celsius - 0.0575 * brine + 1.710523e-3 * brine * np.sqrt(brine) - 2.154996e-4 * brine**2


def conductivity_at(soil: Soil, model: str, state: str, unfrozen: float = 0.0) -> float:
    """A published model with so much water left unfrozen [kg/kg]."""
    if model == "kersten_1949":
        return MODELS[model](soil.dry_density, soil.water_content, grain=soil.grain, state=state)
    return MODELS[model](
        soil.dry_density, soil.water_content, grain=soil.grain, state=state, grain_density=soil.grain_density,
        quartz_fraction=soil.quartz_fraction_used, unfrozen_water=unfrozen * soil.dry_density / 1000.0,
    )  # fmt: skip


def smooth_curve(soil: Soil, model: str, points: int = 20_001) -> Smooth:
    """The curve of a soil by its definition."""
    low, high = 1e-7 * soil.water_content, soil.water_content
    for _ in range(100):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if temperature_of(soil, middle) < COLDEST else (low, middle)
    rest = high
    unfrozen = np.geomspace(soil.water_content, rest, points)
    nodes = np.linspace(rest, soil.water_content, 101)
    share = (nodes - rest) / (soil.water_content - rest)
    frozen = np.array([conductivity_at(soil, model, "frozen", float(node)) for node in nodes])
    thawed = conductivity_at(soil, model, "thawed")
    conducts = CubicSpline(nodes, frozen + share * (thawed - frozen[-1]))(unfrozen)
    capacity = soil.specific_heat_grains + WATER * unfrozen + ICE * (soil.water_content - unfrozen)
    return Smooth(temperature_of(soil, unfrozen), unfrozen, conducts, soil.dry_density * capacity)
