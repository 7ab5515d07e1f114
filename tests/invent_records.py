"""Invent the weather records of the example sites, always the same to the last byte.

Run it from anywhere with ``python tests/invent_records.py``; it writes into ``example_sites/``. The numbers
are no measurement: an annual wave, a daily wave where the record is hourly, and weather as a first-order
autoregressive noise. Only additions and multiplications make the noise, so that every machine invents the
same.
"""

from __future__ import annotations

import datetime as dt
import math
import pathlib
import random
from collections.abc import Iterator

FOLDER = pathlib.Path(__file__).resolve().parent.parent / "example_sites"

DAY = dt.timedelta(days=1)
HOUR = dt.timedelta(hours=1)


def _normal(source: random.Random) -> float:
    """Nearly normal number (sum of twelve uniform ones less six): exact arithmetic, hence the same
    everywhere."""
    return sum(source.random() for _ in range(12)) - 6.0


def _weather(source: random.Random, memory: float, spread: float) -> Iterator[float]:
    """First-order autoregressive noise with standard deviation `spread` [K] and autocorrelation `memory`."""
    state = 0.0
    fresh = math.sqrt(1.0 - memory * memory)
    while True:
        state = memory * state + fresh * spread * _normal(source)
        yield state


def _season(moment: dt.datetime, coldest: dt.datetime) -> float:
    """Cosine of the annual wave: 1 at the coldest time, -1 half a year later."""
    return math.cos(2.0 * math.pi * ((moment - coldest) / DAY) / 365.25)


def wether_lane() -> str:
    """Daily means of six years, cold and continental; the winter of 2018-19 is the severe one."""
    source = random.Random(20150701)
    noise = _weather(source, memory=0.78, spread=1.0)
    missing = {dt.date(2016, 3, 8), dt.date(2017, 11, 20), dt.date(2017, 11, 21)}
    missing |= {dt.date(2019, 8, 3) + day * DAY for day in range(3)}
    sentinels = {dt.date(2016, 12, 29), dt.date(2018, 6, 17), dt.date(2020, 2, 10)}
    doubled = dt.date(2018, 4, 2)
    severe = (dt.datetime(2018, 12, 1), dt.datetime(2019, 3, 20))
    lines = [
        "# Invented for demonstration by tests/invent_records.py; not a measurement",
        "# place: Wether Lane (invented), latitude 47.2, longitude -94.6",
        "# values: daily mean of the air temperature 1.5 m above ground",
        "# time_zone: local standard time (UTC-6)",
        "date,air_temperature_degC",
    ]
    moment = dt.datetime(2015, 7, 1)
    while moment < dt.datetime(2021, 7, 1):
        season = _season(moment, dt.datetime(2016, 1, 18))
        value = 4.2 - 17.0 * season + next(noise) * (4.6 + 2.2 * season)  # weather is rougher in winter
        if severe[0] <= moment < severe[1]:
            value -= 6.5
        date = moment.date()
        text = "-9999" if date in sentinels else f"{value:.1f}"
        if date not in missing:
            lines.append(f"{date.isoformat()},{text}")
        if date == doubled:
            lines.append(f"{date.isoformat()},{text}")
        moment += DAY
    return "\n".join(lines) + "\n"


def kettle_yard() -> str:
    """Hourly readings of one year in degF, cold and near the sea: a long winter, cool summer, small daily
    wave."""
    source = random.Random(20200701)
    noise = _weather(source, memory=0.985, spread=1.0)
    flutter = random.Random(20200702)
    outages = (
        (dt.datetime(2020, 9, 14, 10), 3),
        (dt.datetime(2020, 12, 5, 22), 9),
        (dt.datetime(2021, 2, 17, 4), 1),
        (dt.datetime(2021, 5, 26, 13), 2),
    )
    missing = {first + hour * HOUR for first, hours in outages for hour in range(hours)}
    lines = [
        "# Invented for demonstration by tests/invent_records.py; not a measurement",
        "# place: Kettle Yard (invented), latitude 60.5, longitude -151.0",
        "# values: readings of the air temperature 2 m above ground",
        "# time_zone: local standard time (UTC-9)",
        "time,t_air [degF]",
    ]
    moment = dt.datetime(2020, 7, 1)
    while moment <= dt.datetime(2021, 7, 1):
        season = _season(moment, dt.datetime(2021, 1, 16))
        daily = (2.6 - 1.8 * season) * math.cos(2.0 * math.pi * (moment.hour - 5) / 24.0)
        celsius = 1.2 - 11.5 * season - daily + next(noise) * (3.4 + 2.0 * season) + 0.25 * _normal(flutter)
        if moment not in missing:
            lines.append(f"{moment:%Y-%m-%d %H:%M},{celsius * 1.8 + 32.0:.1f}")
        moment += HOUR
    return "\n".join(lines) + "\n"


def osier_flats() -> str:
    """Daily minimum, maximum and depth of snow of 40 winters, a little milder from decade to decade.

    Snow falls on a third of the days with a mean below 0.5 degC, settles by 2 % a day and melts by 0.5 cm for each
    degree above 0 degC. In the winter of 1993-94 hardly any falls, and February 1996 is the coldest month."""
    source = random.Random(19810701)
    noise = _weather(source, memory=0.80, spread=1.0)
    slow = _weather(source, memory=0.97, spread=1.0)
    missing = {dt.date(1987, 10, 3) + day * DAY for day in range(16)}
    missing |= {dt.date(2004, 2, 11), dt.date(2004, 2, 12), dt.date(2012, 7, 20)}
    sentinels = {dt.date(1990, 1, 5), dt.date(1999, 4, 30), dt.date(2016, 11, 8)}
    bare = (dt.datetime(1993, 10, 1), dt.datetime(1994, 5, 1))
    severe = (dt.datetime(1996, 1, 25), dt.datetime(1996, 3, 1))
    lines = [
        "# Invented for demonstration by tests/invent_records.py; not a measurement",
        "# place: Osier Flats (invented), latitude 46.1, longitude -97.4",
        "# values: daily extremes of the air temperature 2 m above ground; depth of snow at 07:00",
        "# time_zone: local standard time (UTC-6)",
        "date,t_min [degC],t_max [degC],snow_depth [cm]",
    ]
    snow = 0.0
    moment = dt.datetime(1981, 7, 1)
    while moment < dt.datetime(2021, 7, 1):
        season = _season(moment, dt.datetime(1982, 1, 17))
        years = (moment - dt.datetime(1981, 7, 1)) / DAY / 365.25
        mean = 5.0 + 0.03 * years - 16.0 * season + (next(noise) + 0.55 * next(slow)) * (3.6 + 1.6 * season)
        if severe[0] <= moment < severe[1]:
            mean -= 7.0
        half_range = 4.4 - 0.6 * season + 0.9 * _normal(source)
        half_range = max(half_range, 0.8)
        falls, amount = source.random() < 0.34, 7.0 * source.random() * source.random()
        if mean < 0.5 and falls:
            snow += amount * (0.1 if bare[0] <= moment < bare[1] else 1.0)
        snow = max(0.0, 0.98 * snow - 0.5 * max(mean, 0.0))
        if snow < 0.5:
            snow = 0.0
        date = moment.date()
        low, high = f"{mean - half_range:.1f}", f"{mean + half_range:.1f}"
        if date in sentinels:
            low = high = "-9999"
        if date not in missing:
            lines.append(f"{date.isoformat()},{low},{high},{snow:.0f}")
        moment += DAY
    return "\n".join(lines) + "\n"


RECORDS = {
    "osier_flats_weather.csv": osier_flats,
    "wether_lane_air.csv": wether_lane,
    "kettle_yard_air.csv": kettle_yard,
}


def main() -> None:
    """Write every record into the folder of the example sites."""
    FOLDER.mkdir(exist_ok=True)
    for name, invent in RECORDS.items():
        (FOLDER / name).write_bytes(invent().encode("ascii"))


if __name__ == "__main__":
    main()
