"""Density of the snow on the ground: settling with age, or by depth, day and climate class."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt

from soiltemp.climate.moments import show_value
from soiltemp.errors import InputError, UnitError, message
from soiltemp.materials.tables import number
from soiltemp.surface.tables import coefficients
from soiltemp.units import QuantityLike, to_si

__all__ = [
    "CLIMATE_CLASSES",
    "SNOW_DENSITIES",
    "SNOW_DENSITY_RANGE",
    "settled_density_verseghy_1991",
    "snow_density",
    "snow_density_sturm_2010",
    "snow_density_verseghy_1991",
]

Floats = npt.NDArray[np.float64]

SNOW_DENSITY_RANGE = (50.0, 600.0)
"""Densities of seasonal snow that are accepted [kg m-3]: new powder to wet, packed old snow (common practice)."""

CLIMATE_CLASSES = ("alpine", "maritime", "prairie", "taiga", "tundra")
"""Climate classes of seasonal snow that Sturm and others give densities for."""

SNOW_DENSITIES = ("verseghy_1991", *(f"sturm_2010_{name}" for name in CLIMATE_CLASSES))
"""Names that stand for a published density in place of a number."""

_FIRST_DAY, _LAST_DAY = -92, 181  # 1 October and 30 June, as Sturm and others count


def settled_density_verseghy_1991(density: QuantityLike, age: QuantityLike) -> float:
    """Density of a layer of snow after some time of settling, after Verseghy.

    Parameters
    ----------
    density : float or str
        Density at the beginning [kg m-3], 50 to 300.
    age : float or str
        Time since then [s], 0 or more.

    Returns
    -------
    float
        Density [kg m-3].

    Raises
    ------
    InputError, UnitError
        A density or an age out of range.

    Notes
    -----
    ``300 - (300 - rho) exp(-t / 100 h)``, rho in kg/m3.

    References
    ----------
    D. L. Verseghy, CLASS - a Canadian land surface scheme for GCMs, I. Soil model, Int. J. Climatol. 11,
    111-133, 1991; coefficients from memory.

    Examples
    --------
    >>> round(settled_density_verseghy_1991(100.0, "5 days"), 1)
    239.8
    """
    c = coefficients("settling_verseghy_1991")
    settled = number(c["settled_density"])
    rho = to_si(density, "density", "density of snow that settles", low=SNOW_DENSITY_RANGE[0], high=settled)
    time = to_si(age, "time", "age of snow", low=0.0)
    return float(settled - (settled - rho) * np.exp(-time / number(c["settling_time"])))


def snow_density_verseghy_1991(seconds: Floats, depth: Floats) -> Floats:
    """Mean density of snow whose layers settle with age, from readings of its depth.

    Between two readings every layer settles. Where the depth read is above what settling leaves, the
    difference is new snow; where it is below, snow is taken from the top (melted or blown away). The first
    reading is taken as new snow, so a record had better begin before the winter.

    Parameters
    ----------
    seconds : float64 (reading,)
        Times of the readings [s], strictly increasing.
    depth : float64 (reading,)
        Depths of snow [m], 0 or more.

    Returns
    -------
    float64 (reading,)
        Mass over depth [kg m-3]: 100 for new snow, towards 300 with age; NaN where there is none.

    Notes
    -----
    Each layer by :func:`settled_density_verseghy_1991`, from 100 kg/m3. Melt water that freezes again, which
    makes old snow denser than 300 kg/m3, is not counted; denser snow conducts more.

    References
    ----------
    As :func:`settled_density_verseghy_1991`. How the layers are told from the depth is our own.

    Examples
    --------
    >>> snow_density_verseghy_1991(np.array([0.0, 86400.0]), np.array([0.2, 0.0])).tolist()
    [100.0, nan]
    """
    c = coefficients("settling_verseghy_1991")
    settled, time, fresh = number(c["settled_density"]), number(c["settling_time"]), _fresh()
    mass, density = np.zeros(depth.size), np.zeros(depth.size)  # of the layers, the youngest last
    count = 0
    result = np.full(depth.size, np.nan)
    for k in range(depth.size):
        if k > 0:
            fading = np.exp(-(seconds[k] - seconds[k - 1]) / time)
            density[:count] = settled - (settled - density[:count]) * fading
        above = float(np.sum(mass[:count] / density[:count])) - depth[k]
        while count > 0 and above >= 0.0:
            top = mass[count - 1] / density[count - 1]
            if top > above:
                mass[count - 1] -= above * density[count - 1]
                above = 0.0
                break
            above -= top
            count -= 1
        if above < 0.0:
            mass[count], density[count] = -above * fresh, fresh
            count += 1
        if depth[k] > 0.0:
            result[k] = np.sum(mass[:count]) / depth[k]
        else:
            count = 0
    return result


def _fresh() -> float:
    return number(coefficients("fresh_snow")["density"])


def snow_density_sturm_2010(depth: QuantityLike | Floats, day: int | Floats, climate_class: str) -> Any:
    """Mean density of seasonal snow by its depth, the day of the winter and the climate class, after Sturm and others.

    Parameters
    ----------
    depth : float, str or float64 array
        Depth of the snow [m], 0 to 15.
    day : int or array
        Day of the northern winter: -92 on 1 October, -1 on 31 December, 1 on 1 January, 181 on 30 June. There is
        no day 0.
    climate_class : {"alpine", "maritime", "prairie", "taiga", "tundra"}
        Class of the snow.

    Returns
    -------
    float or float64 array
        Mean density [kg m-3].

    Raises
    ------
    InputError, UnitError
        A depth or a day out of range, or an unknown class.

    Notes
    -----
    ``(rho_max - rho_0) (1 - exp(-k_1 h - k_2 d)) + rho_0`` with the depth h in cm and the day d.

    References
    ----------
    M. Sturm and others, Estimating snow water equivalent using snow depth data and climate classes, J.
    Hydrometeorology 11, 1380-1394, 2010, eq. (6) and Table 4; coefficients from memory.

    Examples
    --------
    >>> round(snow_density_sturm_2010("1 m", 60, "alpine"), 1)
    333.6
    """
    if climate_class not in CLIMATE_CLASSES:
        allowed = ", ".join(show_value(name) for name in CLIMATE_CLASSES)
        raise InputError(message("climate class of the snow", show_value(climate_class), allowed, "take one of these"))
    metres = depth if isinstance(depth, np.ndarray) else to_si(depth, "length", "depth of snow", low=0.0, high=15.0)
    days = np.asarray(day)
    if np.any((days < _FIRST_DAY) | (days > _LAST_DAY) | (days == 0)):
        allowed = f"{_FIRST_DAY} to -1 (October to December) and 1 to {_LAST_DAY} (January to June)"
        raise InputError(message("day of the winter", f"{days}", allowed, "count from 1 January as day 1"))
    c = coefficients("sturm_2010")[climate_class]
    growth = 1.0 - np.exp(-c["k_depth"] * 100.0 * metres - c["k_day"] * days)
    density = 1000.0 * (c["fresh"] + (c["greatest"] - c["fresh"]) * growth)
    return density if isinstance(depth, np.ndarray) else float(density)


def _day_of_winter(times: npt.NDArray[np.datetime64], hemisphere: str) -> npt.NDArray[np.int64]:
    """Day as Sturm and others count; July to September have the nearest day that they give."""
    days = times.astype("datetime64[D]")
    if hemisphere == "south":
        days = days + np.timedelta64(184, "D")  # 1 July becomes 1 January (of a common year)
    year = days.astype("datetime64[Y]")
    of_year = (days - year.astype("datetime64[D]")).astype(np.int64) + 1
    length = ((year + 1).astype("datetime64[D]") - year.astype("datetime64[D]")).astype(np.int64)
    before = of_year - length - 1  # -1 on 31 December
    summer_middle = 227  # 15 August, halfway between 30 June and 1 October
    counted = np.where(of_year < summer_middle, np.minimum(of_year, _LAST_DAY), np.maximum(before, _FIRST_DAY))
    return np.asarray(counted, dtype=np.int64)


def snow_density(
    times: npt.NDArray[np.datetime64], depth: Floats, density: Any, *, hemisphere: str = "north"
) -> tuple[Floats, str]:
    """Density of snow at readings of its depth, by a number or a published relation.

    Parameters
    ----------
    times : datetime64 (reading,)
        Times of the readings.
    depth : float64 (reading,)
        Depths [m].
    density : float, str or quantity
        One density [kg m-3], 50 to 600; or ``"verseghy_1991"`` (layers that settle with age) or
        ``"sturm_2010_alpine"`` and so on (depth, day of the winter and climate class).
    hemisphere : {"north", "south"}
        Where the winter is, for Sturm and others: the south takes the density of half a year later.

    Returns
    -------
    density : float64 (reading,)
        [kg m-3]; NaN where there is no snow.
    source : str
        Where it comes from.

    Raises
    ------
    InputError, UnitError
        A density out of range, or an unknown name.

    Examples
    --------
    >>> days = np.array(["2020-01-01", "2020-01-02"], dtype="datetime64[ns]")
    >>> snow_density(days, np.array([0.0, 0.1]), "250 kg/m^3")[0].tolist()
    [nan, 250.0]
    """
    if hemisphere not in ("north", "south"):
        raise InputError(message("hemisphere", show_value(hemisphere), '"north" or "south"', "take one of these"))
    if isinstance(density, str) and density == "verseghy_1991":
        seconds = (times - times[0]) / np.timedelta64(1, "s")
        return snow_density_verseghy_1991(seconds, depth), str(coefficients("settling_verseghy_1991")["source"])
    if isinstance(density, str) and density in SNOW_DENSITIES:
        name = density.removeprefix("sturm_2010_")
        days = _day_of_winter(times, hemisphere)
        rho = snow_density_sturm_2010(depth, days.astype(np.float64), name)
        return np.where(depth > 0.0, rho, np.nan), f"class {name}: {coefficients('sturm_2010')['source']}"
    try:
        one = to_si(density, "density", "snow density", low=SNOW_DENSITY_RANGE[0], high=SNOW_DENSITY_RANGE[1])
    except (InputError, UnitError) as error:
        if not isinstance(density, str) or not density.strip()[:1].isalpha():
            raise
        allowed = ", ".join(show_value(name) for name in SNOW_DENSITIES)
        remedy = 'take one of these, or a density such as "250 kg/m^3"'
        raise InputError(message("snow density", show_value(density), allowed, remedy)) from error
    return np.where(depth > 0.0, one, np.nan), "stated by the user"
