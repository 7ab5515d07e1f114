"""Read a record of weather from a file, check it, and put it on a regular time axis."""

from __future__ import annotations

import hashlib
import os
import pathlib
import stat
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import xarray as xr

from soiltemp.climate.checked import check_raw
from soiltemp.climate.findings import QualityReport
from soiltemp.climate.moments import show_value
from soiltemp.climate.netcdf_record import is_netcdf, raw_from_netcdf
from soiltemp.climate.options import ReadingKeywords, ReadingOptions
from soiltemp.climate.raw import raw_from_text
from soiltemp.errors import DataFileError, InputError, message

if TYPE_CHECKING:
    from typing_extensions import Unpack

__all__ = ["CheckedRecord", "CheckedSeries", "read_checked", "read_record", "read_series"]

_MOST_BYTES = 1_000_000_000  # forty years of minutes take about 500 MB as text, forty years of hours 8 MB


@dataclass(frozen=True)
class CheckedRecord:
    """A temperature record that may be used, and the report of its checks."""

    temperature: xr.DataArray
    report: QualityReport


@dataclass(frozen=True)
class CheckedSeries:
    """A record of any quantity that may be used, and the report of its checks."""

    values: xr.DataArray
    report: QualityReport


def read_record(path: str | os.PathLike[str], **options: Unpack[ReadingKeywords]) -> xr.DataArray:
    r"""Read a temperature record from a CSV or NetCDF file, checked and on a regular time axis.

    The same as ``read_checked(path, ...).temperature``.

    Parameters
    ----------
    path : path
        CSV (commas, semicolons or tabs) or NetCDF file.
    **options
        Keywords of :func:`soiltemp.climate.read_checked`.

    Returns
    -------
    xarray.DataArray
        Temperature(time) [degC], as described there.

    Raises
    ------
    DataFileError, UnitError, InputError
        One sentence: where in the file, what was found, what is allowed, what to do.

    Examples
    --------
    >>> import pathlib, tempfile
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     path = pathlib.Path(folder, "air.csv")
    ...     _ = path.write_text("date,t_air [degF]\n2020-01-01,14.0\n2020-01-02,23.0\n2020-01-03,32.0\n")
    ...     air = read_record(path)
    >>> air.values.round(6).tolist(), air.attrs["cell_methods"]
    ([-10.0, -5.0, 0.0], 'time: mean')
    """
    return read_checked(path, **options).temperature


def read_checked(
    path: str | os.PathLike[str],
    *,
    column: str | Sequence[str] | None = None,
    unit: str | None = None,
    time_column: str | Sequence[str] | None = None,
    time_zone: str | None = None,
    date_order: str | None = None,
    values: str | None = None,
    stamp_at: str = "start",
    longest_gap: Any = "3 days",
    gap_filling: str = "interpolation",
    longest_climatology_gap: Any = "60 days",
    start: Any = None,
    end: Any = None,
    missing_values: Sequence[float | str] = (),
    allowed_range: tuple[Any, Any] | None = None,
    stuck_after: Any = None,
    station: str | None = None,
) -> CheckedRecord:
    r"""Read a temperature record and say what its checks found.

    Parameters
    ----------
    path : path
        CSV file (UTF-8, UTF-16 or Latin-1; comments start with ``#``; one header line; columns separated by
        commas, semicolons or tabs; decimal comma where the comma does not separate columns), CSV file of GHCN-Daily
        (NOAA NCEI; one value a line, or one day a line; known by its header or its first line), or NetCDF file (CF).
    column : str or (str, str), optional
        Column or variable of the temperature; two names are the daily minimum and maximum, whose mean is
        taken. Without it there must be one candidate only, whose name does not tell that it is something else
        (maximum, dew point, soil...). Of GHCN-Daily, an element; else the mean of TMIN and TMAX.
    unit : {"degC", "degF", "K", "tenths degC"}, optional
        Unit, where neither the header (``t_air [degF]``, ``temp_C``), a comment (``# unit: degC``) nor the
        attributes state it. A unit is never assumed.
    time_column : str or sequence of str, optional
        Column of the time; or two (date, time of day), or three to four (year, month, day, hour).
    time_zone : str, optional
        ``"UTC"``, ``"UTC-6"`` or ``"local standard time"``; kept in the attributes, the times are not
        shifted.
    date_order : {"day-month-year", "month-day-year"}, optional
        For dates that end with the year, where the data do not show it.
    values : {"mean", "point"}, optional
        Whether a value is the mean over its interval or the temperature at its time. Without it, and without
        a statement in the file: dates without a time of day are means of the day; shorter intervals are
        points.
    stamp_at : {"start", "middle", "end"}
        Where in its interval the time of a mean stands in the file; in the result it always is the start.
    longest_gap : str or float
        Longest gap that is filled by interpolation, up to 30 days. Linear
        interpolation over more than a few hours of an hourly record loses the daily wave.
    gap_filling : {"interpolation", "climatology"}
        What is done about longer gaps: they are refused; or filled by climatology plus anomaly, which is what the day
        of the year and the hour let expect from at least 3 years of every season, plus what the days before and
        after the gap deviate from it, fading as fast as the record forgets it.
    longest_climatology_gap : str or float
        Longest gap that climatology may fill, up to 92 days; longer ones are refused.
    start, end : str or datetime64, optional
        Time to use; means must lie wholly inside, points may stand on either end. The record must cover it.
    missing_values : sequence of float or str
        Further numbers (in the unit of the file) or words that stand for "no value".
    allowed_range : (low, high)
        Possible temperatures [degC]; -90 to 60 unless stated.
    stuck_after : str or float, optional
        Time for which the same value marks a stuck sensor: 5 days for daily values and 1 day for shorter
        intervals unless stated; ``"never"`` for deep ground.
    station : str, optional
        Station of a GHCN-Daily file that holds several.

    Returns
    -------
    CheckedRecord
        ``temperature``: DataArray over ``time`` (regular, datetime64[ns], the clock as stated in the
        attribute ``time_zone``), float64 [degC], with the coordinate ``filled`` (0 measured, 1 interpolated,
        2 climatology plus anomaly) and the attributes ``units``, ``long_name``, ``cell_methods``, ``interval``,
        ``time_zone``, ``source_file``, ``source_sha256``, ``quality_report``. Of means, ``time`` is the start of the
        interval. ``report``: what the checks found.

    Raises
    ------
    DataFileError
        The file, or the values in it, cannot be used.
    UnitError
        No unit, or two different ones.
    InputError
        An option that cannot be.

    Examples
    --------
    >>> import pathlib, tempfile
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     path = pathlib.Path(folder, "air.csv")
    ...     rows = [f"2020-01-{day:02d};{-day / 2:.1f}".replace(".", ",") for day in range(1, 21)]
    ...     text = "# unit: degC\ndate;t_air\n" + "\n".join(rows) + "\n"
    ...     _ = path.write_text(text.replace("-4,5", "-9999"))
    ...     checked = read_checked(path)
    >>> [finding.kind for finding in checked.report.findings], float(checked.temperature[8].round(6))
    (['assumption', 'sentinel', 'gap_filled'], -4.5)
    """
    values_and_report = _read(
        path, "temperature", column=column, unit=unit, time_column=time_column, time_zone=time_zone,
        date_order=date_order, values=values, stamp_at=stamp_at, longest_gap=longest_gap, gap_filling=gap_filling,
        longest_climatology_gap=longest_climatology_gap, start=start, end=end, missing_values=missing_values,
        allowed_range=allowed_range, stuck_after=stuck_after, station=station,
    )  # fmt: skip
    return CheckedRecord(*values_and_report)


def read_series(
    path: str | os.PathLike[str], *, quantity: str = "temperature", **options: Unpack[ReadingKeywords]
) -> CheckedSeries:
    r"""Read a record of any quantity and say what its checks found.

    Parameters
    ----------
    path : path
        CSV or NetCDF file.
    quantity : {"temperature", "snow_depth", "wind_speed", "solar_radiation"}
        What to read.
    **options
        Keywords of :func:`soiltemp.climate.read_checked`. Units of snow depth are m, cm, mm, in and ft, of wind speed
        m/s, km/h, mph, kn and ft/s, of solar radiation W/m^2, kW/m^2, MJ/m^2/day, J/cm^2/day and kWh/m^2/day, and
        tenths of each. `gap_filling` by climatology is for temperatures only.

    Returns
    -------
    CheckedSeries
        ``values``: DataArray over ``time`` as that of `read_checked`, in degC, m, m/s or W/m^2. Snow depths are
        readings (``cell_methods = "time: point"``) unless stated otherwise.

    Raises
    ------
    DataFileError, UnitError, InputError
        As `read_checked`. Negative values are impossible, but for the zero error of radiometers, which is set to 0.

    Notes
    -----
    Only a temperature is looked at for spikes, jumps, outliers against the season and step changes. Snow may lie
    unchanged, so a repeated depth is no fault unless `stuck_after` is stated; neither is calm air, nor a dark sky.

    Examples
    --------
    >>> import pathlib, tempfile
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     path = pathlib.Path(folder, "snow.csv")
    ...     _ = path.write_text("date,snow_depth [cm]\n2020-01-01,0\n2020-01-02,12\n2020-01-03,11\n")
    ...     snow = read_series(path, quantity="snow_depth").values
    >>> snow.values.tolist(), snow.attrs["units"], snow.attrs["cell_methods"]
    ([0.0, 0.12, 0.11], 'm', 'time: point')
    """
    return CheckedSeries(*_read(path, quantity, **options))


def _read(path: Any, quantity: Any, **keywords: Any) -> tuple[xr.DataArray, QualityReport]:
    places = {
        name: keywords.pop(name, None) for name in ("column", "time_column", "time_zone", "date_order", "station")
    }
    options = ReadingOptions.read(quantity_name=quantity, **keywords)
    data, source = _load(path)
    if is_netcdf(data):
        if places["station"] is not None:
            found = f"{show_value(places['station'])} and a NetCDF file"
            allowed = "a station of a file of GHCN-Daily"
            raise InputError(message("station", found, allowed, "leave station out"))
        del places["station"], places["date_order"]
        raw = raw_from_netcdf(path, source, options.wanted, unit=options.unit, **places)
    else:
        raw = raw_from_text(
            data, source, options.wanted, unit=options.unit, missing_words=options.missing_words, **places
        )
    return check_raw(raw, options, hashlib.sha256(data).hexdigest())


def _load(path: Any) -> tuple[bytes, str]:
    """Bytes and name of the file."""
    if not isinstance(path, (str, os.PathLike)):
        found = f"{type(path).__name__} {show_value(path)}"
        raise InputError(message("path", found, "the path of a CSV or NetCDF file", "give it as text or a Path"))
    place = pathlib.Path(os.fsdecode(path))
    source = show_value(place.name or str(place), 80).strip('"')
    allowed = "a CSV or NetCDF file that can be read"
    try:
        status = place.stat()
        usable = stat.S_ISREG(status.st_mode) and status.st_size <= _MOST_BYTES
        data = place.read_bytes() if usable or stat.S_ISDIR(status.st_mode) else None  # a folder raises
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        found = f"no readable file at {show_value(place, 200)} ({str(reason).lower()})"
        raise DataFileError(message(source, found, allowed, "check the path, and that it is a file")) from error
    if data is not None:
        return data, source
    if stat.S_ISREG(status.st_mode):
        found, remedy = f"a file of {status.st_size / 1e9:.4g} GB", "cut the record to the years and columns you need"
        raise DataFileError(message(source, found, f"a record of up to {_MOST_BYTES / 1e9:g} GB", remedy))
    found = f"a device, pipe or socket at {show_value(place, 200)}"
    allowed = f"a regular CSV or NetCDF file of up to {_MOST_BYTES / 1e9:g} GB"
    raise DataFileError(message(source, found, allowed, "give the path of such a file"))
