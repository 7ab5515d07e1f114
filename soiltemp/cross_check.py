"""Closed forms beside a numerical answer: the annual wave, and the frost of the coldest winter.

None of them is the truth: each leaves something out, says what in its `comment`, and is left out itself, with the
reason, where it does not apply. Numbers that agree within what is left out are a check that neither is grossly wrong.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise
from typing import Any, Literal

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from soiltemp.climate.moments import show_moment, whole_years
from soiltemp.closed_form import (
    ModifiedBerggrenSteps,
    amplitude_ratio,
    damping_depth,
    layered_periodic,
    phase_lag,
)
from soiltemp.constants import DAY, HOUR, YEAR
from soiltemp.errors import InputError, message
from soiltemp.frost import frost_depth
from soiltemp.frost_formulas import modified_berggren_of, stefan_of, wet_layers
from soiltemp.glossary import attributes
from soiltemp.ground import Profile
from soiltemp.surface import forcing_knots
from soiltemp.units import from_si

__all__ = ["closed_form_lines", "closed_forms_beside"]

Floats = NDArray[np.float64]

FEWEST_OUTPUTS = 12
"""Outputs in the last year below which no wave is fitted to them."""

LONGEST_FROST = 330 * DAY
"""Time from the first frost of a winter in which its frost is looked for [s]: it may last into summer."""

SMALLEST_WAVE = 0.5
"""Amplitude of the surface [K] below which a year has no wave worth comparing."""

SMALLEST_REMAINDER = 0.01
"""Amplitude at a depth [K] below which its lag is noise: the numerical error is of that size."""

_WAVES = tuple(
    f"annual_{what}{how}" for what in ("amplitude_ratio", "phase_lag") for how in ("", "_layered", "_uniform")
)


@dataclass(frozen=True, eq=False)
class _Surface:
    """The surface temperature as the solver integrates it, and the wave fitted to its whole years."""

    seconds: Floats
    celsius: Floats
    start: np.datetime64
    years: int
    mean: float
    """Over the last whole years [degC]; NaN where there is none."""
    wave: complex
    """Complex amplitude c of Re(c exp(i omega t)), t since `start` [K]."""

    def moment(self, seconds: float) -> str:
        """Date of a time since the start."""
        return show_moment((self.start + np.timedelta64(round(seconds), "s")).astype("datetime64[D]"))


@dataclass(frozen=True)
class _Winter:
    """The coldest winter: freezing index [K s], and its first and last moment in seconds since the start."""

    index: float
    first: float
    last: float
    text: str


def closed_forms_beside(profile: Profile, surface_temperature: xr.DataArray, result: xr.Dataset) -> xr.Dataset:
    """Closed forms of the annual wave and of frost, with the numerical answers that they stand beside.

    Parameters
    ----------
    profile : Profile
        The ground.
    surface_temperature : xr.DataArray (time)
        Surface temperature [degC] that the result was computed with.
    result : xr.Dataset
        What `solve` returned for them.

    Returns
    -------
    xr.Dataset
        Scalars: `surface_annual_mean` [degC], `surface_annual_amplitude` [K], `damping_depth_annual` [m];
        `coldest_winter_freezing_index` [K s], `freezing_season` [s], `stefan_frost_depth`,
        `modified_berggren_frost_depth` [m], `modified_berggren_lambda` [1]; and the numerical `maximum_frost_depth`,
        `maximum_frozen_ground_depth` [m].
        By depth: `annual_amplitude_ratio` [1] and `annual_phase_lag` [s] of the numerical answer, and the same with
        `_layered` (exact without freezing) and `_uniform` (the top layer alone) behind. Each has a `comment`: why it
        may differ from the numerical answer, or why it is left out (NaN).

    Raises
    ------
    InputError, UnitError
        Arguments that `solve` would refuse too.

    Notes
    -----
    The wave is that of 365 days, fitted with a mean by least squares: to the surface over its last whole years, to the
    ground over the last year of the result and to the surface over the same year. Lags are given on the turn of the
    year that lies nearest to the layered solution.

    A winter is the time between two warmest moments of the fitted wave, in either hemisphere; the whole series, where
    it is shorter than a year. Its index is the height of the cumulative curve of degree-time from its highest to its
    lowest point, its season the time between them. The coldest winter has the largest index.

    References
    ----------
    H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., Oxford 1959, sections 2.6 and 3.7.
    UFC 3-130-06 (TM 5-852-6, January 1988), chapter 3; TM 5-852-4/AFM 88-19 Chap. 4 (UFC 3-130-04), definition of the
    freezing index.

    Examples
    --------
    >>> import soiltemp
    >>> rock = soiltemp.Material("rock", 3.0, 3.0, 2e6, 2e6, 0.0)
    >>> profile = soiltemp.Profile([soiltemp.Layer(rock, 20.0)])
    >>> surface = soiltemp.periodic_surface(8.0, 10.0, "01-20", start="2020-07-01", years=1, every="1D")
    >>> result = soiltemp.solve(profile, surface, initial="cycle", depths=[2.0], numerical_error="left out")
    >>> beside = closed_forms_beside(profile, surface, result)
    >>> round(float(beside.annual_amplitude_ratio[0]), 3), round(float(beside.annual_amplitude_ratio_layered[0]), 3)
    (0.597, 0.597)
    """
    surface = _read_surface(surface_temperature)
    found = {**_waves(profile, surface, result), **_frost(profile, surface, result)}
    return xr.Dataset(
        {
            name: (("depth",) if np.ndim(value) else (), value, {**attributes(name), "comment": comment})
            for name, (value, comment) in found.items()
        },
        coords={"depth": result["depth"]},
    )


# ---- the annual wave -----------------------------------------------------------------------------------------


def _read_surface(surface_temperature: xr.DataArray) -> _Surface:
    seconds, celsius, start = forcing_knots(surface_temperature)
    years = whole_years(float(seconds[-1]))
    mean, wave = _fit(seconds, celsius, float(seconds[-1]), years) if years else (np.nan, complex(np.nan))
    return _Surface(seconds, celsius, start, years, mean, wave)


def _fit(seconds: Floats, celsius: Floats, end: float, years: int) -> tuple[float, complex]:
    """Mean and complex amplitude of a curve over the whole years before `end`."""
    every = end - HOUR * np.arange(years * YEAR / HOUR)
    mean, wave = _harmonic(every, np.interp(every, seconds, celsius)[:, None])
    return float(mean[0]), complex(wave[0])


def _harmonic(seconds: Floats, values: Floats) -> tuple[Floats, NDArray[np.complex128]]:
    """Mean and complex amplitude of the annual wave in the columns of `values`, by least squares."""
    angle = 2.0 * np.pi / YEAR * seconds
    terms = np.stack([np.ones_like(angle), np.cos(angle), np.sin(angle)], axis=1)
    (mean, cosine, sine), *_ = np.linalg.lstsq(terms, values, rcond=None)
    return mean, cosine - 1j * sine


def _waves(profile: Profile, surface: _Surface, result: xr.Dataset) -> dict[str, tuple[Any, str]]:
    """Everything about the annual wave, as (value, comment) by name."""
    top = profile.layers[0]
    state: Literal["thawed", "frozen"] = "frozen" if surface.mean < 0.0 else "thawed"
    diffusivity = getattr(top.material, f"diffusivity_{state}")
    short = "Left out: the surface temperature covers less than a year."
    over = f"Of the last {surface.years * 365} days of the surface temperature"
    found: dict[str, tuple[Any, str]] = {
        "surface_annual_mean": (surface.mean, f"{over}." if surface.years else short),
        "surface_annual_amplitude": (
            abs(surface.wave),
            f"{over}, fitted; weather and daily waves are not in it." if surface.years else short,
        ),
        "damping_depth_annual": _attempt(
            lambda: damping_depth(diffusivity, YEAR),
            f'Of layer 1 "{top.name}" alone, {state}, without latent heat: diffusivity {diffusivity:.3g} m2 s-1. Other '
            "layers, and freezing, change the wave.",
        ),
    }
    depths = np.asarray(result["depth"], dtype=np.float64)
    nothing = np.full(depths.size, np.nan)
    reason = _no_wave(surface, result)
    if reason:
        return found | dict.fromkeys(_WAVES, (nothing, f"Left out: {reason}."))
    numerical, reference = _numerical_wave(surface, result)
    layered, layered_lag = _layered_wave(profile, depths, state)
    turn = YEAR / (2.0 * np.pi)
    lag = layered_lag + turn * np.angle(np.exp(-1j * (np.angle(numerical) + layered_lag / turn)))
    noise = SMALLEST_REMAINDER / abs(reference)
    faint = f" No lag where less than {SMALLEST_REMAINDER:g} K of the wave is left."
    fitted = "Fitted to the outputs of the last 365 days; colder and warmer years before leave a trace."
    exact = (
        f"Exact for these layers, {state}, if no water froze and every year were alike; where water freezes, its "
        "latent heat changes the wave, mostly to a weaker and later one."
    )
    alone = f'As if all the ground were layer 1 "{top.name}", {state}, without freezing and without end.'
    uniform: tuple[Any, Any] = (nothing, nothing)
    if np.isnan(found["damping_depth_annual"][0]):
        alone = found["damping_depth_annual"][1]
    else:
        uniform = (amplitude_ratio(depths, diffusivity, YEAR), phase_lag(depths, diffusivity, YEAR))
    values = (
        *((np.abs(numerical), fitted), (layered, exact), (uniform[0], alone)),
        (np.where(np.abs(numerical) > noise, lag, np.nan), fitted + faint),
        (np.where(layered > noise, layered_lag, np.nan), exact + faint),
        (uniform[1], alone),
    )
    return found | dict(zip(_WAVES, values, strict=True))


def _no_wave(surface: _Surface, result: xr.Dataset) -> str:
    """Why no annual wave can be compared; empty if one can."""
    times = result["time"].values
    span = float((times[-1] - times[0]) / np.timedelta64(1, "s"))
    if not surface.years or span + DAY < YEAR:
        return "the run covers less than a year"
    if abs(surface.wave) < SMALLEST_WAVE:
        return f"the annual wave of the surface is below {SMALLEST_WAVE:g} K"
    if int(np.sum(times > times[-1] - np.timedelta64(365, "D"))) < FEWEST_OUTPUTS:
        return f"the last year has fewer than {FEWEST_OUTPUTS} outputs"
    return ""


def _numerical_wave(surface: _Surface, result: xr.Dataset) -> tuple[NDArray[np.complex128], complex]:
    """Complex amplitude at each depth by that of the surface, over the last year of the result; and the latter [K]."""
    seconds = np.asarray((result["time"].values - surface.start) / np.timedelta64(1, "ns") / 1e9)
    end = float(seconds[-1])
    inside = seconds > end - YEAR
    temperature = result["ground_temperature"].transpose("time", "depth").values[inside].astype(np.float64)
    reference = _fit(surface.seconds, surface.celsius, end, 1)[1]
    return _harmonic(seconds[inside], temperature)[1] / reference, reference


def _layered_wave(profile: Profile, depths: Floats, state: Literal["thawed", "frozen"]) -> tuple[Floats, Floats]:
    """Amplitude ratio and lag [s], counted on past a year, of the layered solution."""
    between = [np.linspace(top, base, 200) for top, base in pairwise(profile.interfaces)]
    # interfaces are rounded to a nanometre and may pass the sum of the layers
    depths = np.minimum(depths, sum(layer.thickness for layer in profile.layers))
    every = np.unique(np.concatenate([*(piece[:-1] for piece in between), depths]))
    ratio = layered_periodic(profile, YEAR, every, state=state)
    lag = -np.unwrap(np.angle(ratio)) * YEAR / (2.0 * np.pi)
    at = np.searchsorted(every, depths)
    return np.abs(ratio)[at], lag[at]


# ---- frost ---------------------------------------------------------------------------------------------------


def _coldest_winter(surface: _Surface) -> _Winter:
    """The winter with the largest freezing index, see :func:`closed_forms_beside`."""
    seconds, celsius = surface.seconds, surface.celsius
    left, right = celsius[:-1], celsius[1:]
    # the cumulative curve turns where the temperature passes 0 degC: those moments become knots
    crosses = np.flatnonzero(left * right < 0.0)
    zeros = seconds[crosses] + np.diff(seconds)[crosses] * left[crosses] / (left[crosses] - right[crosses])
    time = np.insert(seconds, crosses + 1, zeros)
    value = np.insert(celsius, crosses + 1, 0.0)
    curve = np.concatenate([[0.0], np.cumsum(0.5 * (value[1:] + value[:-1]) * np.diff(time))])
    edges = np.array([-np.inf, np.inf])
    if surface.years and abs(surface.wave) >= SMALLEST_WAVE:
        warmest = (-np.angle(surface.wave) / (2.0 * np.pi) * YEAR) % YEAR
        edges = np.concatenate([[-np.inf], np.arange(warmest, time[-1], YEAR), [np.inf]])
    best = _Winter(0.0, 0.0, 0.0, "no freezing")
    for first, last in pairwise(edges):
        inside = np.flatnonzero((time >= first) & (time <= last))
        if inside.size < 2:
            continue
        part = curve[inside]
        fall = np.maximum.accumulate(part) - part
        low = int(np.argmax(fall))
        high = low - int(np.argmax(part[low::-1]))
        if fall[low] > best.index:
            begin, end = float(time[inside[high]]), float(time[inside[low]])
            text = f"{surface.moment(begin)} to {surface.moment(end)}"
            text += ", begun before the series" if inside[high] == 0 and value[0] < 0.0 else ""
            text += ", cut short by the end of the series" if inside[low] == time.size - 1 and value[-1] < 0.0 else ""
            best = _Winter(float(fall[low]), begin, end, text)
    return best


def _frost(profile: Profile, surface: _Surface, result: xr.Dataset) -> dict[str, tuple[Any, str]]:
    """Everything about frost, as (value, comment) by name."""
    winter = _coldest_winter(surface)
    season = winter.last - winter.first
    reason = _no_frost(profile, surface, winter)
    when = f"Winter of {winter.text}."
    names = ("stefan_frost_depth", "modified_berggren_frost_depth", "modified_berggren_lambda")
    found: dict[str, tuple[Any, str]] = {
        "coldest_winter_freezing_index": (
            winter.index,
            f"{when} Warm spells inside the winter count against it." if winter.index else "The surface never freezes.",
        ),
        "freezing_season": (season, when if winter.index else "The surface never freezes."),
        "maximum_frost_depth": (
            float(frost_depth(result).max()),
            "Numerical, of all outputs: the deepest line of 0 degC; the ice does not reach as deep.",
        ),
        "maximum_frozen_ground_depth": (
            (float(result["frozen_ground_depth"].max()), "Numerical, of all outputs: the depth reckoned from the ice.")
            if "frozen_ground_depth" in result
            else (np.nan, "Left out: the result does not hold frozen_ground_depth.")
        ),
    }
    found |= _numerical_frost(surface, winter, result)
    if reason:
        return found | dict.fromkeys(names, (np.nan, f"Left out: {reason}."))
    number = wet_layers(profile)
    dry = f" Layer {number} is the last that holds water." if number < len(profile.layers) else ""
    is_smooth = any(layer.material.freezing_curves is not None for layer in profile.layers[:number])
    smooth = (
        " Soil with unfrozen water enters as it is at -20 degC: its 0 degC line lies far deeper." if is_smooth else ""
    )
    found[names[0]] = _attempt(
        lambda: stefan_of(profile, winter.index),
        f"{when} Latent heat and frozen conductivity only; to be set beside the frozen ground, which the heat stored "
        "in the ground, left out here, makes shallower. The 0 degC line runs ahead of the ice where water freezes over "
        f"a range of temperatures, and may be the deeper one.{smooth}",
        dry,
    )
    if not surface.years:
        unknown = "Left out: less than a year does not tell the mean annual temperature."
        return found | dict.fromkeys(names[1:], (np.nan, unknown))
    steps: list[ModifiedBerggrenSteps] = []

    def berggren() -> float:
        season_and_mean = {"season_length": season, "mean_temperature": surface.mean}
        steps.append(modified_berggren_of(profile, winter.index, **season_and_mean))
        return steps[0].depth

    found[names[1]] = _attempt(
        berggren,
        f"{when} The whole winter as one step of temperature of {season / DAY:.0f} days, ground at the mean of the "
        f"surface, {surface.mean:.1f} degC, means of frozen and thawed properties, all water freezing at 0 degC: as a "
        "rule shallower than the 0 degC line of soil that freezes over a range.",
        dry,
    )
    why = "What the stored heat leaves of Stefan's depth with these mean properties."
    found[names[2]] = (steps[0].lambda_coefficient, why) if steps else (np.nan, found[names[1]][1])
    return found


def _numerical_frost(surface: _Surface, winter: _Winter, result: xr.Dataset) -> dict[str, tuple[Any, str]]:
    """Numerical frost of the coldest winter: from its first moment until it has had time to thaw."""
    seconds = np.asarray((result["time"].values - surface.start) / np.timedelta64(1, "ns") / 1e9)
    inside = (seconds >= winter.first) & (seconds <= winter.first + LONGEST_FROST)
    series = {"frost_depth": frost_depth(result), "frozen_ground_depth": result.get("frozen_ground_depth")}
    found: dict[str, tuple[Any, str]] = {}
    for name, depths in series.items():
        if depths is None:
            found[f"coldest_winter_{name}"] = np.nan, f"Left out: the result does not hold {name}."
        elif winter.index == 0.0 or not inside.any():
            found[f"coldest_winter_{name}"] = 0.0, "The surface never freezes."
        else:
            found[f"coldest_winter_{name}"] = (
                float(depths.values[inside].max()),
                f"Numerical, of the winter of {winter.text}.",
            )
    return found


def _no_frost(profile: Profile, surface: _Surface, winter: _Winter) -> str:
    """Why no closed form of frost applies; empty if one does."""
    if winter.index == 0.0:
        return "the surface never freezes"
    if surface.mean < 0.0:
        mean = f"the mean of the surface, {surface.mean:.1f} degC, is below freezing"
        return f"{mean}: in permafrost it is the thaw that ends at a depth"
    if not wet_layers(profile):
        return "no layer holds water that freezes, and these formulas know no other end of the frost"
    return ""


def _attempt(formula: Callable[[], float], comment: str, note: str = "") -> tuple[float, str]:
    """Value and comment of a formula, or NaN and the reason why it does not apply, with a note."""
    try:
        return formula(), comment
    except InputError as error:
        return float("nan"), f"Left out: {error}{note}"


# ---- for the command line ------------------------------------------------------------------------------------

_ROWS = (0.0, 0.5, 1.0, 1.5, 2.0, 3.0, 5.0, 10.0)
_SHOWN = {
    "si": {
        "length": ("m", "m"),
        "temperature": ("degC", "degC"),
        "temperature_difference": ("K", "K"),
        "freezing_index": ("K day", "K day"),
    },
    "us": {
        "length": ("ft", "ft"),
        "temperature": ("degF", "degF"),
        "temperature_difference": ("delta_degF", "degF"),
        "freezing_index": ("delta_degF day", "degF day"),
    },
}


def closed_form_lines(dataset: xr.Dataset, *, units: str = "si") -> tuple[str, ...]:
    """What :func:`closed_forms_beside` found, as lines of text.

    Parameters
    ----------
    dataset : xr.Dataset
        From there, or a result that holds the same variables.
    units : {"si", "us"}
        Metres and degC, or feet and degF.

    Returns
    -------
    tuple of str
        Two tables, and for every closed form the reason why it differs or is left out. Empty where `dataset` holds
        none.

    Raises
    ------
    InputError
        Other units.

    Examples
    --------
    >>> closed_form_lines(xr.Dataset())
    ()
    """
    if units not in _SHOWN:
        raise InputError(message("units", f"{units!r}", '"si" or "us"', "choose one of the two"))
    if "surface_annual_mean" not in dataset:
        return ()

    def shown(name: str, kind: str, digits: int) -> str:
        unit, label = _SHOWN[units][kind]
        value = float(dataset[name])
        return f"{from_si(value, kind, unit):.{digits}f} {label}" if np.isfinite(value) else "left out"

    mean = shown("surface_annual_mean", "temperature", 1)
    wave = shown("surface_annual_amplitude", "temperature_difference", 1)
    index, season = shown("coldest_winter_freezing_index", "freezing_index", 0), float(dataset["freezing_season"]) / DAY
    zero = "32 degF" if units == "us" else "0 degC"
    rows = (
        ("freezing index of the surface", f"{index} in {season:.0f} days"),
        ("frost by Stefan's equation", shown("stefan_frost_depth", "length", 2)),
        ("frost by the modified Berggren equation", shown("modified_berggren_frost_depth", "length", 2)),
        (f"numerical, line of {zero}, that winter", shown("coldest_winter_frost_depth", "length", 2)),
        ("numerical, frozen ground, that winter", shown("coldest_winter_frozen_ground_depth", "length", 2)),
    )
    comments = (
        ("damping depth", "damping_depth_annual"),
        ("layered", "annual_amplitude_ratio_layered"),
        ("uniform", "annual_amplitude_ratio_uniform"),
        ("freezing index", "coldest_winter_freezing_index"),
        ("Stefan", "stefan_frost_depth"),
        ("modified Berggren", "modified_berggren_frost_depth"),
    )
    return (
        f"Annual wave of the surface: mean {mean}, amplitude {wave}",
        *_wave_table(dataset, units),
        "Frost of the winter that is coldest at the surface",
        *(f"  {text:<42}{value}" for text, value in rows),
        "Why they differ",
        *(f"  {text}: {dataset[name].attrs['comment']}" for text, name in comments),
    )


def _wave_table(dataset: xr.Dataset, units: str) -> list[str]:
    """Rows of amplitude ratios and lags, at depths of the result near to round ones."""
    depths = np.asarray(dataset["depth"], dtype=np.float64)
    unit, label = _SHOWN[units]["length"]
    nearest = sorted({int(np.argmin(np.abs(depths - depth))) for depth in _ROWS if depth <= depths[-1]})
    methods = ("numerical", "layered", "uniform")
    heads = ("depth", *(f"{what}, {method}" for what in ("ratio", "lag") for method in methods))
    lines = ["".join(f"{head:>18}" for head in heads)]
    for row in nearest:
        cells = [f"{from_si(float(depths[row]), 'length', unit):.2f} {label}"]
        for name in _WAVES:
            value = float(dataset[name][row])
            # + 0.0 turns a rounded -0.0 into 0.0
            text = f"{value:.3f}" if "ratio" in name else f"{round(value / DAY, 1) + 0.0:.1f} days"
            cells.append(text if np.isfinite(value) else "-")
        lines.append("".join(f"{cell:>18}" for cell in cells))
    return lines
