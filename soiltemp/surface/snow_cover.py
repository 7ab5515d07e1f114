"""Snow on the ground as a thermal resistance that changes with time."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.climate.quantities import quantity
from soiltemp.errors import InputError, message
from soiltemp.glossary import attributes
from soiltemp.materials.composition import check_choice
from soiltemp.materials.snow import SNOW_MODELS
from soiltemp.materials.tables import coefficients as material_coefficients
from soiltemp.surface.snow_density import snow_density
from soiltemp.surface.snow_depth import monthly_snow_depth
from soiltemp.surface.weather_series import weather_series

__all__ = ["snow_cover", "snow_resistances"]

Floats = npt.NDArray[np.float64]


def snow_cover(
    depth: Any,
    *,
    density: Any,
    conductivity_model: str,
    hemisphere: str = "north",
    start: Any = None,
    end: Any = None,
) -> xr.Dataset:
    """Snow on the ground as a thermal resistance over time.

    The snow stores no heat here and its melting takes none: it is what lies between air and ground. There is no
    default density and no default model: more conductive snow is the cautious choice against frost.

    Parameters
    ----------
    depth : xarray.DataArray, or sequence or mapping of float or str
        Snow depth over ``time`` [m] as the values of :func:`soiltemp.climate.read_series`, 0 to 15 m; or twelve
        monthly means, as :func:`monthly_snow_depth` takes them.
    density : float, str or quantity
        One density [kg m-3], 50 to 600; or a published relation: ``"verseghy_1991"`` (layers that settle with
        age) or ``"sturm_2010_alpine"``, ``"..._maritime"``, ``"..._prairie"``, ``"..._taiga"``,
        ``"..._tundra"`` (by depth, day of the winter and climate class).
    conductivity_model : {"calonne_2011", "sturm_1997", "sturm_1997_log", "yen_1981"}
        Published model of the conductivity by density. They differ by a factor near 2.
    hemisphere : {"north", "south"}, optional
        Where the winter is, for the relation of Sturm and others.
    start, end : str or datetime64, optional
        First and last date, with monthly means only, where they must be given.

    Returns
    -------
    xarray.Dataset
        Over ``time``: ``snow_depth`` [m], ``snow_density`` [kg m-3] and ``snow_conductivity`` [W m-1 K-1] (NaN
        where there is no snow), and ``snow_resistance`` [m2 K W-1] (0 there), at the times of the depth.

    Raises
    ------
    InputError, UnitError
        A series with gaps, wrong units or impossible depths; a density out of range; an unknown name; dates
        beside a record, or none beside monthly means.

    Notes
    -----
    ``R = h / k(rho)`` with the mean density of the snow. Layers of different density in series resist a little
    more than their mean does, so this errs on the side of frost.

    Examples
    --------
    >>> days = np.array(["2020-01-01", "2020-01-02"], dtype="datetime64[ns]")
    >>> record = xr.DataArray([0.0, 0.23], dims="time", coords={"time": days})
    >>> snow_cover(record, density="300 kg/m^3", conductivity_model="yen_1981").snow_resistance.values.round(3).tolist()
    [0.0, 1.001]
    """
    check_choice(conductivity_model, tuple(SNOW_MODELS), "snow, conductivity model")
    bare = _depth_and_density(depth, density, hemisphere, start, end)
    return _with_conductivity(bare, conductivity_model)


def snow_resistances(
    depth: Any, *, density: Any, hemisphere: str = "north", start: Any = None, end: Any = None
) -> xr.Dataset:
    """Resistance of the same snow by every conductivity model, side by side.

    Parameters
    ----------
    depth, density, hemisphere, start, end
        As :func:`snow_cover` takes them.

    Returns
    -------
    xarray.Dataset
        ``snow_conductivity`` and ``snow_resistance`` over (``conductivity_model``, ``time``), ``snow_depth``
        and ``snow_density`` over ``time``.

    Raises
    ------
    InputError, UnitError
        As :func:`snow_cover`.

    Examples
    --------
    >>> days = np.array(["2020-01-01", "2020-01-02"], dtype="datetime64[ns]")
    >>> record = xr.DataArray([0.3, 0.3], dims="time", coords={"time": days})
    >>> every = snow_resistances(record, density=300.0)
    >>> every.snow_resistance.sel(conductivity_model="sturm_1997").values.round(2).tolist()
    [2.38, 2.38]
    """
    bare = _depth_and_density(depth, density, hemisphere, start, end)
    each = [_with_conductivity(bare, model)[["snow_conductivity", "snow_resistance"]] for model in SNOW_MODELS]
    models = xr.DataArray(list(SNOW_MODELS), dims="conductivity_model", name="conductivity_model")
    together = xr.concat(each, dim=models, combine_attrs="drop")
    together["conductivity_model"].attrs = attributes("conductivity_model")
    return together.assign(bare.data_vars)


def _depth_and_density(depth: Any, density: Any, hemisphere: str, start: Any, end: Any) -> xr.Dataset:
    dates = f"start {start}, end {end}"
    if isinstance(depth, xr.DataArray):
        if start is not None or end is not None:
            remedy = "leave them out; the air temperature decides what is used"
            raise InputError(message("snow depth", f"{dates} beside a record", "a record alone", remedy))
    else:
        if start is None or end is None:
            remedy = "give the first and the last date of the time studied"
            allowed = "a start and an end beside monthly means, or a DataArray over time"
            raise InputError(message("snow depth", dates, allowed, remedy))
        depth = monthly_snow_depth(depth, start=start, end=end)
    series = weather_series(depth, "length", "snow depth", quantity("snow_depth").allowed_range)
    times = depth["time"]
    metres = np.maximum(series.values, 0.0)
    rho, source = snow_density(times.values, metres, density, hemisphere=hemisphere)
    methods = {key: depth.attrs[key] for key in ("cell_methods", "interval", "time_zone") if key in depth.attrs}
    return xr.Dataset(
        {
            "snow_depth": ("time", metres, attributes("snow_depth") | methods),
            "snow_density": ("time", rho, attributes("snow_density") | methods | {"source": source}),
        },
        coords={"time": times},
    )


def _with_conductivity(bare: xr.Dataset, model: str) -> xr.Dataset:
    depth, rho = bare["snow_depth"].values, bare["snow_density"].values
    conductivity = np.full(depth.size, np.nan)
    lies = depth > 0.0
    densities, place = np.unique(rho[lies], return_inverse=True)
    conductivity[lies] = np.array([SNOW_MODELS[model](float(value)) for value in densities])[place]
    resistance = np.zeros(depth.size)
    resistance[lies] = depth[lies] / conductivity[lies]
    source = material_coefficients(f"conductivity_{model}")["source"]
    methods = {key: bare["snow_depth"].attrs[key] for key in ("cell_methods", "interval", "time_zone")
               if key in bare["snow_depth"].attrs}  # fmt: skip
    return bare.assign(
        snow_conductivity=("time", conductivity, attributes("snow_conductivity") | methods | {"source": source}),
        snow_resistance=("time", resistance, attributes("snow_resistance") | methods),
    )
