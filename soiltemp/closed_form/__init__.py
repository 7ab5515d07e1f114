"""Answers in closed form: quick estimates, truths for the tests, first guesses for the solver."""

from soiltemp.closed_form.layered import (
    layered_periodic,
    layered_periodic_flux,
    layered_periodic_flux_ratio,
    layered_periodic_ratio,
)
from soiltemp.closed_form.modified_berggren import (
    ModifiedBerggrenSteps,
    layered_modified_berggren_depth,
    layered_modified_berggren_steps,
    modified_berggren_depth,
    modified_berggren_lambda,
    modified_berggren_steps,
)
from soiltemp.closed_form.neumann import neumann_front, neumann_temperature
from soiltemp.closed_form.periodic import (
    amplitude_ratio,
    damping_depth,
    kusuda_achenbach_temperature,
    penetration_depth_iso_13370,
    periodic_temperature,
    phase_lag,
)
from soiltemp.closed_form.stefan import frost_depth_fair_geyer_okun, layered_stefan_depth, stefan_depth
from soiltemp.closed_form.step_change import step_change_depth, step_change_temperature

__all__ = [
    "ModifiedBerggrenSteps",
    "amplitude_ratio",
    "damping_depth",
    "frost_depth_fair_geyer_okun",
    "kusuda_achenbach_temperature",
    "layered_modified_berggren_depth",
    "layered_modified_berggren_steps",
    "layered_periodic",
    "layered_periodic_flux",
    "layered_periodic_flux_ratio",
    "layered_periodic_ratio",
    "layered_stefan_depth",
    "modified_berggren_depth",
    "modified_berggren_lambda",
    "modified_berggren_steps",
    "neumann_front",
    "neumann_temperature",
    "penetration_depth_iso_13370",
    "periodic_temperature",
    "phase_lag",
    "stefan_depth",
    "step_change_depth",
    "step_change_temperature",
]
