"""No text whatever gets past the reader of site files but as a Site or as one of our own errors."""

from __future__ import annotations

import re
from typing import Any

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from soiltemp.errors import SoilTempError
from soiltemp.site import KEYS, Site, parse_site
from tests.test_site_bad_input import GOOD

SETTINGS = settings(deadline=None, suppress_health_check=[HealthCheck.too_slow], max_examples=150)


def check(text: str) -> None:
    """Parse; on refusal see that the message is one printable sentence with its parts."""
    try:
        site = parse_site(text, folder=".")
    except SoilTempError as error:
        said = str(error)
        assert "\n" not in said
        assert re.search(r": found .*; allowed: .*; .*\.$", said), said
        assert len(said) < 1500
    else:
        assert isinstance(site, Site)


@given(st.text(max_size=300))
@SETTINGS
def test_any_text(text: str) -> None:
    check(text)


# letters that mean something to TOML, to units or to dates
PIECES = st.sampled_from(
    [*"[]{}=\"'#.,-+_\\\n\t 0123456789eE:TZ%", "true", "nan", "inf", '"""', "degC", "\x00", "\x1b", "\ud800", "é", "[["]
)


@given(st.integers(0, len(GOOD)), st.integers(0, 20), st.lists(PIECES, max_size=6))
@SETTINGS
def test_good_text_with_a_part_exchanged(start: int, length: int, pieces: list[str]) -> None:
    check(GOOD[:start] + "".join(pieces) + GOOD[start + length :])


@given(st.integers(0, len(GOOD)))
@SETTINGS
def test_good_text_cut_short(length: int) -> None:
    check(GOOD[:length])


def written(value: Any) -> str:
    """A value as TOML."""
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, str):
        plain = (
            letter if letter.isprintable() and letter not in '"\\' and ord(letter) < 0xD800 else f"\\u{ord(letter):04x}"
            for letter in value
        )
        return f'"{"".join(plain)}"'
    if isinstance(value, list):
        return f"[{', '.join(map(written, value))}]"
    if isinstance(value, dict):
        return f"{{ {', '.join(f'{written(key)} = {written(item)}' for key, item in value.items())} }}"
    return repr(value)


TEXTS = st.text(st.characters(max_codepoint=0xD7FF), max_size=20) | st.sampled_from(
    ["1 m", "-1 m", "1e300 m", "4 degC", "cycle", "turf", "fine", "2019-07-01", "1D", "1e999 K", "24 %", "ice", "01-20"]
)
PLAIN = st.booleans() | st.integers() | st.floats() | TEXTS
KEY = st.sampled_from(sorted({key for keys in KEYS.values() for key in keys} | {"depth", "temperature"})) | TEXTS
VALUES = st.recursive(PLAIN, lambda inner: st.lists(inner, max_size=3) | st.dictionaries(KEY, inner, max_size=3))

GOOD_TABLES = {
    "site": {"name": "Made up", "latitude": 47.2, "longitude": -94.6},
    "climate": {"periodic": {"mean": "4 degC", "amplitude": "17 K", "coldest": "01-20"}},
    "surface": {"freezing_n_factor": 0.5, "thawing_n_factor": 0.8},
    "layer": {"material": "sand, saturated", "thickness": "20 m"},
    "line": {"cover": "1.8 m", "outside_diameter": "0.3 m"},
    "study": {"start": "2019-07-01", "end": "2020-07-01"},
}


@given(st.sampled_from(sorted(GOOD_TABLES)), st.data())
@SETTINGS
def test_any_value_for_any_key(section: str, data: st.DataObject) -> None:
    key = data.draw(st.sampled_from(KEYS[section]))
    tables: dict[str, Any] = {**GOOD_TABLES, section: {**GOOD_TABLES[section], key: data.draw(VALUES)}}
    tables["layer"] = [tables["layer"]]
    check("\n".join(f"{name} = {written(value)}" for name, value in tables.items()))


@given(st.sampled_from(["layer.soil", "layer.material", "climate.periodic", "initial"]), st.data())
@SETTINGS
def test_any_value_inside_a_table(table: str, data: st.DataObject) -> None:
    good: dict[str, dict[str, Any]] = {
        "layer.soil": {"grain": "fine", "dry_density": "1500 kg/m^3", "water_content": 0.2},
        "layer.material": {
            "name": "b",
            "conductivity_thawed": "1 W/(m K)",
            "conductivity_frozen": "1 W/(m K)",
            "heat_capacity_thawed": "1 MJ/(m^3 K)",
            "heat_capacity_frozen": "1 MJ/(m^3 K)",
            "latent_heat": "0 J/m^3",
        },
        "climate.periodic": {"mean": "4 degC", "amplitude": "17 K", "coldest": "01-20"},
        "initial": {"depth": "0 m", "temperature": "4 degC"},
    }
    key = data.draw(st.sampled_from(KEYS.get(table, ("depth", "temperature"))))
    value = good[table] | {key: data.draw(VALUES)}
    tables: dict[str, Any] = dict(GOOD_TABLES)
    if table == "initial":
        tables["study"] = {**GOOD_TABLES["study"], "initial": [value, {"depth": "20 m", "temperature": "4 degC"}]}
    elif table == "climate.periodic":
        tables["climate"] = {"periodic": value}
    else:
        tables["layer"] = {"thickness": "20 m", table.removeprefix("layer."): value}
    tables["layer"] = [tables["layer"]]
    check("\n".join(f"{name} = {written(item)}" for name, item in tables.items()))
