"""Any bytes whatever: a record, or one sentence; never another error."""

from __future__ import annotations

import pathlib
import tempfile
from typing import Any

import numpy as np
from hypothesis import HealthCheck, example, given, settings
from hypothesis import strategies as st

from soiltemp.climate import read_checked, read_series
from soiltemp.climate.quantities import quantity
from soiltemp.errors import SoilTempError
from tests.helpers.faults import GOOD, WAVE, assert_one_sentence, daily, hourly

SETTINGS = settings(max_examples=300, deadline=None, suppress_health_check=[HealthCheck.too_slow])

PIECES = st.sampled_from(
    [
        *(
            "date",
            "time",
            "t_air",
            "temp",
            "[degC]",
            "degF",
            "K",
            "year",
            "month",
            "day",
            "hour",
            "#",
            "# unit: degC\n",
        ),
        *(
            ",",
            ";",
            "\t",
            "\n",
            "\r\n",
            '"',
            "-",
            ".",
            " ",
            ":",
            "/",
            "\ufeff",
            "\x00",
            "\x85",
            "\u2028",
            "²",
            "\N{ARABIC-INDIC DIGIT ONE}",
        ),
        *(
            "2020-01-01",
            "2020-01-02",
            "01/02/2020",
            "31.12.2020",
            "20200103",
            "2020-01-01T05:00Z",
            "9999-12-31",
            "24:00",
        ),
        *(
            "-9999",
            "1.5",
            "1,5",
            "1e308",
            "-1e400",
            "nan",
            "inf",
            "0x10",
            "1_0",
            "99.9",
            "300",
            "NA",
            "12:61",
            "+05:30",
        ),
        *(
            "0000-00-00",
            "1750-01-01",
            "2200-01-01",
            "99999999999999999999",
            "2020-1-1",
            "# time_zone: UTC+99\n",
        ),
    ]
)


def attempt(content: bytes, **options: Any) -> None:
    """Read the bytes; a good answer is finite and regular, a refusal is one sentence."""
    with tempfile.TemporaryDirectory() as folder:
        path = pathlib.Path(folder, "air.csv")
        path.write_bytes(content)
        try:
            checked = read_checked(path, **options)
        except SoilTempError as error:
            assert_one_sentence(str(error))
            return
    temperature = checked.temperature
    assert np.isfinite(temperature.values).all()
    assert temperature.values.min() >= -90.0
    assert temperature.values.max() <= 60.0
    assert len(set(np.diff(temperature.time.values))) == 1
    assert temperature.attrs["quality_report"].isascii()
    assert int(temperature.filled.sum()) == checked.report.filled


@SETTINGS
@given(st.binary(max_size=400))
@example(b"CDF\x01" + bytes(100))
@example(b"CDF\x05" + b"\xff" * 100)
@example(b"\x89HDF\r\n\x1a\n" + bytes(100))
@example(b"\x89HDF\r\n\x1a\n" + b"\xff" * 100)
@example(b"\xff\xfe")
@example(b"\xfe\xff\xd8\x00")
@example(b"\xef\xbb\xbf")
def test_any_bytes(content: bytes) -> None:
    """Bytes without any sense."""
    attempt(content)


@SETTINGS
@given(st.lists(PIECES, max_size=60).map("".join), st.sampled_from([None, "degC", "degF"]))
def test_any_pieces(text: str, unit: str | None) -> None:
    """Words and marks of records in any order."""
    attempt(text.encode(), unit=unit)


@SETTINGS
@given(st.data())
def test_any_cells(data: st.DataObject) -> None:
    """A table of the right shape with cells of any kind."""
    header = data.draw(st.sampled_from(["date,t_air [degC]", "time;t [degF]", "date,hour,t_air [K]", "date\tx [degC]"]))
    mark = next(letter for letter in header if letter in ",;\t")
    width = header.count(mark) + 1
    rows = data.draw(st.lists(st.lists(PIECES, min_size=width, max_size=width), min_size=1, max_size=12))
    attempt("\n".join([header, *(mark.join(row) for row in rows)]).encode())


GHCN_WIDE = "STATION,DATE,TMAX,TMAX_ATTRIBUTES,TMIN,TMIN_ATTRIBUTES\n" + "".join(
    f'"USC00999901","2020-01-{day:02d}"," {5 * day}",",,7","{-50 - day}",",I,7"\n' for day in range(1, 20)
)
SOURCES = (
    "".join(
        f"USC00999901,202001{day:02d},{key},{-day},,,7,0700\n" for day in range(1, 20) for key in ("TMIN", "TMAX")
    ).encode(),
    GHCN_WIDE.encode(),
    GOOD.encode(),
    daily(WAVE[:60]).encode(),
    hourly("2020-03-01", 60).encode(),
    daily(WAVE[:40]).replace(",", ";").replace(".", ",").encode("utf-16"),
)


@SETTINGS
@given(st.data())
def test_damaged_records(data: st.DataObject) -> None:
    """Good records with bytes replaced, taken out, doubled, put in, or cut off."""
    content = bytearray(data.draw(st.sampled_from(SOURCES)))
    for _ in range(data.draw(st.integers(1, 6))):
        at = data.draw(st.integers(0, max(len(content) - 1, 0)))
        length = data.draw(st.integers(0, 40))
        kind = data.draw(st.sampled_from(["replace", "remove", "double", "insert", "cut", "piece"]))
        if kind == "replace":
            content[at : at + 1] = data.draw(st.binary(min_size=1, max_size=1))
        elif kind == "remove":
            del content[at : at + length]
        elif kind == "double":
            content[at:at] = content[at : at + length]
        elif kind == "insert":
            content[at:at] = data.draw(st.binary(max_size=4))
        elif kind == "piece":
            content[at:at] = data.draw(PIECES).encode()
        else:
            del content[at:]
    attempt(bytes(content))


@SETTINGS
@given(st.lists(PIECES, max_size=40).map("".join), st.sampled_from(["snow_depth", "wind_speed", "solar_radiation"]))
@example("", "snow_depth")
def test_any_pieces_of_other_quantities(text: str, name: str) -> None:
    """The same for other quantities, below a good header."""
    with tempfile.TemporaryDirectory() as folder:
        path = pathlib.Path(folder, "a.csv")
        path.write_text(f"date,{name} [{next(iter(quantity(name).units))}]\n2020-01-01,1\n2020-01-02,2\n{text}")
        try:
            values = read_series(path, quantity=name).values
        except SoilTempError as error:
            assert_one_sentence(str(error))
            return
    low, high = quantity(name).allowed_range
    assert np.isfinite(values).all()
    assert low <= float(values.min()) <= float(values.max()) <= high
