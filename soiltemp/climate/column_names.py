"""Names that say that a column is not the air temperature itself: extremes, ground, water, humidity and the like."""

from __future__ import annotations

import re

from soiltemp.climate.moments import show_name
from soiltemp.errors import DataFileError, message

__all__ = ["check_name", "telling_word"]

_WORDS = (
    *("maximum", "max", "minimum", "min", "highest", "high", "lowest", "low"),
    *("dewpoint", "dewpt", "dew", "wetbulb", "wet", "frostpoint", "moisture"),
    *("humidity", "humid", "humidex", "hum", "rh"),
    *("windchill", "chill", "wind", "feels", "feelslike", "feel", "apparent", "perceived", "heatindex", "index"),
    *("subsoil", "soil", "underground", "ground", "grass", "concrete", "road", "pavement", "asphalt", "skin", "depth"),
    *("water", "sea", "sst", "lake", "river", "pool", "snow", "ice", "pipe"),
    *("probe", "logger", "battery", "board", "indoor", "inside", "room", "internal"),
    *("range", "amplitude", "difference", "anomaly", "departure", "std", "sd", "pressure", "rain", "precipitation"),
    *("boden", "erde", "wasser", "taupunkt", "feuchte", "luftfeuchte"),
)
_WHOLE = frozenset(["tx", "tn", "tmx", "tmn", "td", "tw", "tsl", "precip", "prcp", "rel"])
_AROUND = "t|air|temp|temps|temperature|temperatur|daily|day|d|mean|avg|point|bulb|index"
_TELLING = re.compile(f"(?:{_AROUND})*({'|'.join(sorted(_WORDS, key=len, reverse=True))})(?:{_AROUND})*")
_HEIGHT = re.compile(r"(?:above|over)[\s_]*(?:the[\s_]*)?ground(?:[\s_]*(?:level|surface))?", re.IGNORECASE)
_MINUTES = re.compile(r"(?<![A-Za-z0-9])(?:1|5|10|15|20|30|60)[\s_-]?min(?![A-Za-z])", re.IGNORECASE)
_NEAR_GROUND = re.compile(r"(?<![\d.])\d{1,2}[\s_]?cm(?![A-Za-z])", re.IGNORECASE)  # screens stand at 1.2 to 2 m
_CASES = re.compile(r"(?<=[a-z])(?=[A-Z])|(?<=[A-Z])(?=[A-Z][a-z])")


def telling_word(name: str) -> str | None:
    """Part of `name` that says that it is not the air temperature itself, or None.

    Examples
    --------
    >>> telling_word("tmax_degC"), telling_word("DewPoint [degC]"), telling_word("soil_temperature_50cm")
    ('tmax', 'DewPoint', '50cm')
    >>> telling_word("air_temperature_2m_above_ground"), telling_word("t_10min_mean"), telling_word("whatever")
    (None, None, None)
    """
    text = _MINUTES.sub(" ", _HEIGHT.sub(" ", name))
    near = _NEAR_GROUND.search(text)
    if near is not None:
        return near.group()
    whole = re.split(r"[\W\d_]+", text)
    for word in (*whole, *(part for entry in whole for part in _CASES.split(entry))):
        if word.lower() in _WHOLE or _TELLING.fullmatch(word.lower()):
            return word
    return None


def check_name(name: str, where: str, option: str, listed: str, *further: str) -> None:
    """Refuse a column that nobody chose and whose name tells that it is something else.

    Parameters
    ----------
    name : str
        Name of the column or variable.
    where : str
        File, for the message.
    option : str
        What the file calls it: "column" or "variable".
    listed : str
        All names of the file, for the message.
    *further : str
        Other texts that say what it is.

    Raises
    ------
    DataFileError
        The name, or a further text, holds such a word.
    """
    for text in (name, *further):
        word = telling_word(text)
        if word is not None:
            shown = f'"{show_name(name)}"'
            found = f'for the temperature only the {option} {shown}, which "{show_name(word)}" tells is something else'
            allowed = f"one {option} of air temperature (means or readings), or what column names"
            remedy = (
                f"if it is what you mean, set column to {shown}; else to another of {listed}, "
                "or to the names of the daily minimum and maximum"
            )
            raise DataFileError(message(where, found, allowed, remedy))
