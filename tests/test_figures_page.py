"""The page: its answers are those of the result, it loads nothing, and users' text stays text."""

from __future__ import annotations

import re
from html.parser import HTMLParser
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr

from soiltemp.cautions import CAUTION_SHORT, CAUTIONS
from soiltemp.errors import DataFileError, InputError
from soiltemp.figures import save_page
from soiltemp.figures.answers import answers, depth_rows, trust, winter_rows
from soiltemp.figures.display import display
from soiltemp.figures.reading import BuriedLine
from tests.test_figures_wave import DAY, wave

ATTACK = '</script><script>document.title="taken"</script><img src=x onerror=alert(1)>&'
SI = display("si")


class Parts(HTMLParser):
    """Tags, what they would load, and the text outside scripts and styles."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.tags: list[str] = []
        self.loads: list[str] = []
        self.words: list[str] = []
        self.answers: dict[str, str] = {}
        self._open: list[str] = []
        self._answer: str | None = None
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append(tag)
        self._open.append(tag)
        values = dict(attrs)
        for name in ("src", "href", "data", "action", "srcset", "poster"):
            if values.get(name):
                self.loads.append(str(values[name]))
        self._answer = values.get("data-answer")

    def handle_endtag(self, tag: str) -> None:
        self._answer = None
        while self._open and self._open.pop() != tag:
            pass

    def handle_data(self, data: str) -> None:
        if self._open and self._open[-1] in ("script", "style"):
            if self._open[-1] == "style":
                self.loads += re.findall(r"@import[^;]*|url\([^)]*\)", data)
            return
        self.words.append(data)
        if self._answer:
            self.answers[self._answer] = self.answers.get(self._answer, "") + data


def saved(folder: Path, result: xr.Dataset, **more: Any) -> tuple[str, Parts]:
    path = folder / "page.html"
    save_page(result, path, **more)
    text = path.read_text(encoding="utf-8")
    return text, Parts(text)


def test_answers_are_those_of_the_result(tmp_path: Path) -> None:
    result = wave()
    _, parts = saved(tmp_path, result, line=("3 m", "0.3 m"), title="Kettle Yard", layers=(("silt", 0.0, 8.0),))
    deepest = float(result["frost_depth"].max())
    at = str(result["time"].values[int(np.argmax(result["frost_depth"].values))])[:10]
    assert parts.answers["maximum_frost_depth"] == f"{deepest:.2f} m on {at}; numerical error 0.02 m"
    assert parts.answers["maximum_frozen_ground_depth"].startswith(f"{0.9 * deepest:.2f} m on {at}")
    assert parts.answers["line_margin"] == (
        f"the crown at 3.00 m lies {3.0 - deepest:.2f} m below the greatest frost depth of the time studied"
    )
    crown = result["ground_temperature"].sel(depth=3.0, method="nearest")
    assert parts.answers["line_crown"].startswith(f"{float(crown.min()):.1f} °C on ")
    words = " ".join(" ".join(parts.words).split())
    assert "Kettle Yard" in words
    assert CAUTION_SHORT in words
    for caution in CAUTIONS:
        assert caution in words
    for caption in ("Frost through time", "Coldest, mean and warmest", "Temperature through time", "at chosen depths"):
        assert caption in words


def test_us_page_has_no_si_units_in_its_answers(tmp_path: Path) -> None:
    result = wave()
    _, parts = saved(tmp_path, result, units="us", line=(1.0, 0.3))
    deepest = float(result["frost_depth"].max()) / 0.3048
    assert parts.answers["maximum_frost_depth"].startswith(f"{deepest:.1f} ft on ")
    assert "32 °F line" in " ".join(parts.words)
    answered = " ".join(parts.answers.values())
    assert not re.search(r"\d (m|°C)\b", answered), answered


def test_page_loads_nothing(tmp_path: Path) -> None:
    text, parts = saved(tmp_path, wave())
    assert parts.loads == []
    assert "link" not in parts.tags
    # formulas would make bokeh fetch what it sets them with
    data = text[text.index('<script type="application/json"') :]
    assert "$$" not in data
    assert "cdn.bokeh.org" not in data


def test_text_of_users_stays_text(tmp_path: Path) -> None:
    plain, counted = saved(tmp_path, wave(), layers=(("silt", 0.0, 8.0),))
    result = wave().assign(
        closed=((), 1.0, {"units": "m", "long_name": ATTACK, "comment": ATTACK}),
        input_site_file=((), f'[site]\nname = "{ATTACK}"\n'),
    )
    result.attrs["initial_state"] = ATTACK
    text, parts = saved(tmp_path, result, title=ATTACK, layers=((ATTACK, 0.0, 8.0),))
    assert parts.tags.count("script") == counted.tags.count("script")
    assert parts.tags.count("img") == 0
    assert parts.loads == []
    assert ATTACK not in text
    assert "".join(parts.words).count(ATTACK) >= 6  # title and heading, layer, closed form twice, start, site file
    assert plain.count("</script>") == text.count("</script>")


def with_inputs(result: xr.Dataset, *, name: str = "silt", source: str = "a data sheet") -> xr.Dataset:
    """Two layers as `run` writes them: one that freezes from -0.5 to 0 degC with 100 MJ/m^3, a board that does not."""
    gap = np.nan
    between = 0.5 * (1.5e6 + 2.5e6) + 100e6 / 0.5
    dims = ("input_layer", "input_piece")
    site = 'surface = { cover = "grass & snow" }'
    filled = np.array([0, 1, 1, 0], dtype=np.int8)
    made = result.assign(
        input_layer_name=("input_layer", np.array([name, "board"], dtype=object)),
        input_layer_source=("input_layer", np.array([source, ""], dtype=object)),
        input_layer_thickness=("input_layer", [6.096, 1.904]),
        input_knot=(dims, [[-0.5, 0.0, gap], [gap] * 3]),
        input_frozen_share=(dims, [[1.0, 0.0, gap], [gap] * 3]),
        input_heat_capacity=(dims, [[1.5e6, between, 2.5e6], [45e3, gap, gap]]),
        input_conductivity=(dims, [[2.0, 1.5, 1.0], [0.036, gap, gap]]),
        input_site_file=((), site),
        input_air_temperature=("input_time", np.zeros(4), {"time_zone": "UTC-6", "source_sha256": "af32"}),
        input_air_temperature_filled=("input_time", filled),
    )
    made.attrs.update(
        surface_rule="n-factors: freezing 0.5; a table", quality_report="air.csv: 2 interpolated", elements="172"
    )
    return made


def test_page_tells_what_it_stands_on(tmp_path: Path) -> None:
    _, parts = saved(tmp_path, with_inputs(wave()))
    words = [word.strip() for word in parts.words if word.strip()]
    at = words.index("silt")
    assert words[at : at + 10] == [
        "silt", "0.00 m", "6.10 m", "1", "2", "2.5", "1.5", "100", "−0.5 to 0", "a data sheet",
    ]  # fmt: skip
    at = words.index("board")
    assert words[at + 3 : at + 10] == ["0.036", "0.036", "0.045", "0.045", "0", "nothing freezes", "source not stated"]
    facts = {words[n]: words[n + 1] for n in range(len(words) - 1)}
    assert facts["Cover of the surface"] == "grass & snow"
    assert facts["Surface"] == "n-factors: freezing 0.5; a table"
    assert facts["Air temperature, SHA-256 of the file"] == "af32"
    assert facts["Air temperature, time zone"] == "UTC-6"
    assert facts["Air temperature, values used"] == "4, 2 of them interpolated"
    assert facts["Quality report of the record"] == "air.csv: 2 interpolated"
    assert facts["Elements of the column"] == "172"
    assert words.index("Pictures") < words.index("What it stands on") < words.index("How far to trust these numbers")
    # 1 W/(m K) = 0.5778 BTU/(h ft degF), 1 MJ/m^3 = 26.84 BTU/ft^3, 1 MJ/(m^3 K) = 14.91 BTU/(ft^3 degF): BTU (IT)
    # 1055.056 J, foot 0.3048 m (NIST SP 811, 2008, App. B.8)
    _, parts = saved(tmp_path, with_inputs(wave()), units="us")
    words = [word.strip() for word in parts.words if word.strip()]
    at = words.index("silt")
    assert words[at + 2 : at + 9] == ["20.0 ft", "0.578", "1.16", "37.3", "22.4", "2684", "31.1 to 32"]


def test_inputs_are_escaped_and_optional(tmp_path: Path) -> None:
    text, parts = saved(tmp_path, with_inputs(wave(), name=ATTACK, source=ATTACK))
    assert ATTACK not in text
    assert "".join(parts.words).count(ATTACK) == 2
    assert "img" not in parts.tags
    text, parts = saved(tmp_path, wave())
    assert "What it stands on" not in text
    _, parts = saved(tmp_path, wave().assign_attrs(initial_state="5 degC everywhere"))
    assert "5 degC everywhere" in parts.words
    assert "Air temperature, values used" not in parts.words


def test_cautions_and_site_name_without_a_title(tmp_path: Path) -> None:
    result = wave()
    result.attrs["site_name"] = "Wether Lane"
    _, parts = saved(tmp_path, result)
    assert parts.words.count("Wether Lane") == 2
    with pytest.raises(InputError, match=r"^title: found .*; allowed: a text of up to 200 characters; shorten it\.$"):
        save_page(result, tmp_path / "x.html", title="x" * 201)


def test_one_depth_has_a_page_without_a_map(tmp_path: Path) -> None:
    text, parts = saved(tmp_path, wave(depths=(1.0,)), line=(1.5, 0.3))
    assert "The result holds one depth only" in " ".join(parts.words)
    assert text.count("<figure>") == 3
    assert "the result holds no temperature at 1.50 m" in parts.answers["line_crown"]


def test_old_page_survives_a_failed_write(tmp_path: Path) -> None:
    path = tmp_path / "page.html"
    save_page(wave(), path)
    before = path.read_bytes()
    broken = wave()
    broken["ground_temperature"][5, 3] = np.nan
    with pytest.raises(InputError, match="missing values"):
        save_page(broken, path)
    assert path.read_bytes() == before
    assert [entry.name for entry in tmp_path.iterdir()] == ["page.html"]


def test_page_is_renamed_into_its_place(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "page.html"
    path.write_text("old")

    def full(*_: Any) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("os.replace", full)
    with pytest.raises(DataFileError, match="no space left"):
        save_page(wave(), path)
    assert path.read_text() == "old"
    assert [entry.name for entry in tmp_path.iterdir()] == ["page.html"]


@pytest.mark.parametrize("name", ["page.txt", "missing/page.html", ""])
def test_impossible_places_are_refused(tmp_path: Path, name: str) -> None:
    with pytest.raises(InputError, match=r"^path \".*: found .*; allowed: .*; .*\.$"):
        save_page(wave(), tmp_path / name)


# --- answers -------------------------------------------------------------------------------------------


def found(result: xr.Dataset, line: BuriedLine | None = None) -> dict[str, str]:
    return {answer.key: answer.text for answer in answers(result, SI, line)}


def test_frost_that_reaches_the_line_is_said_loudly() -> None:
    result = wave()
    deepest = float(result["frost_depth"].max())
    said = found(result, BuriedLine(1.5, 0.3))
    assert said["line_margin"] == f"FROST REACHES THE LINE: it goes {deepest - 1.5:.2f} m below the crown at 1.50 m"
    assert re.search(r"^−\d+\.\d+ °C on 2021-\d\d-\d\d; below freezing for \d+ days in all$", said["line_crown"])
    days = int(re.findall(r"for (\d+) days", said["line_crown"])[0])
    below = int((result["ground_temperature"].sel(depth=1.5, method="nearest") < 0.0).sum())
    assert abs(days - below) <= 1
    # the crown at the very frost depth counts as reached
    assert found(result, BuriedLine(deepest, 0.3))["line_margin"].startswith("FROST REACHES THE LINE")


def test_no_frost_and_frost_to_the_base_are_said() -> None:
    warm = found(wave(mean=20.0), BuriedLine(1.0, 0.3))
    assert warm["maximum_frost_depth"] == "none: nothing freezes in the time studied"
    assert warm["frost_time"] == "none"
    assert warm["line_margin"] == "the crown lies at 1.00 m; no frost in the time studied"
    cold = found(wave(mean=-10.0, amplitude=8.0), BuriedLine(1.0, 0.3))
    assert cold["maximum_frost_depth"].startswith("at least 8.00 m: frozen to the base of the column; only a deeper")
    assert "error" not in cold["maximum_frost_depth"]
    assert cold["maximum_thaw_depth"] == "none: nothing thaws from above in the time studied"
    assert "maximum_thaw_depth" not in warm
    rows = {row[0]: row[1] for row in trust(wave(mean=-10.0, amplitude=8.0), SI)}
    assert rows["Frost depth, numerical error"] == "not stated"
    assert winter_rows(wave(mean=-10.0, amplitude=8.0), SI)[0][1] == "at least 8.00 m"
    assert cold["frost_time"].startswith("all the time, 2020-07-01 to ")
    assert cold["line_margin"] == "frost passes the crown at 1.00 m: the column is frozen to its base"


def test_greatest_thaw_is_told_where_ground_stays_frozen() -> None:
    # mean -5, amplitude 15: the warmest of the year is 0 degC where exp(-z / 2) = 5 / 15, at 2 ln 3 = 2.197 m; the
    # straight lines over 0.1 m between depths leave less than a centimetre
    result = wave(mean=-5.0)
    said = found(result)["maximum_thaw_depth"]
    assert re.fullmatch(r"2\.(19|20) m on 2020-\d\d-\d\d; the ground below stays frozen all year", said), said
    given = found(result.assign(thaw_depth=("time", np.linspace(0.0, 1.5, result.sizes["time"]))))
    assert given["maximum_thaw_depth"].startswith("1.50 m on 2021-07-01;")
    # a winter alone is no year, and ground that thaws through has no such depth
    assert "maximum_thaw_depth" not in found(wave(mean=-5.0, days=200))
    assert "maximum_thaw_depth" not in found(wave())


def test_winters_are_cut_where_there_is_least_frost() -> None:
    rows = winter_rows(wave(days=4 * 365), SI)
    assert [row[0] for row in rows] == ["2021", "2022", "2023", "2024"]
    assert all(row[1] == rows[0][1] for row in rows)
    assert all(row[3].startswith(str(int(row[0]) - 1)) or row[3].startswith(row[0]) for row in rows)
    # frost that lasts until July belongs to the winter that made it
    times = np.datetime64("2017-09-01", "ns") + np.arange(3 * 365) * DAY
    day = np.arange(3 * 365) % 365
    frost = np.where((day > 60) & (day < 320), (day - 60) / 130.0, 0.0)  # deepest, 2 m, in mid July
    result = xr.Dataset(
        {
            "ground_temperature": (("time", "depth"), np.zeros((times.size, 2))),
            "frost_depth": ("time", frost),
        },
        {"time": times, "depth": [0.0, 5.0]},
    )
    rows = winter_rows(result, SI)
    assert [(row[0], row[2][:7]) for row in rows] == [("2018", "2018-07"), ("2019", "2019-07"), ("2020", "2020-07")]


def test_southern_winters_are_named_by_the_year_they_end_in() -> None:
    times = np.datetime64("2018-01-01", "ns") + np.arange(2 * 365) * DAY
    winter = np.clip(-np.cos(2.0 * np.pi * (np.arange(730) - 10) / 365.0) - 0.3, 0.0, None)  # frost about July
    result = xr.Dataset(
        {
            "ground_temperature": (
                ("time", "depth"), np.stack([5.0 - 10.0 * winter + 5.0 * (winter == 0.0)] * 2, axis=1),
            ),
            "frost_depth": ("time", winter),
        },
        {"time": times, "depth": [0.0, 5.0]},
    )  # fmt: skip
    assert [row[0] for row in winter_rows(result, SI)] == ["2018", "2019"]


def test_scraps_of_winters_are_left_out() -> None:
    rows = winter_rows(wave(mean=-10.0, amplitude=8.0), SI)
    assert len(rows) == 1


def test_depth_table_holds_the_extremes_with_their_days() -> None:
    result = wave()
    rows = {row[0]: row for row in depth_rows(result, SI)}
    series = result["ground_temperature"].sel(depth=1.5, method="nearest")
    low, high = str(series.idxmin().values)[:10], str(series.idxmax().values)[:10]
    assert rows["1.50 m"] == (
        "1.50 m",
        f"−{abs(float(series.min())):.1f} °C, {low}",
        f"{float(series.mean()):.1f} °C",
        f"{float(series.max()):.1f} °C, {high}",
        "0.020 K",
    )
    assert [row[0] for row in depth_rows(result, display("us"))][:3] == ["0.00 ft", "1.0 ft", "2.0 ft"]
    assert depth_rows(wave(errors=False), SI)[0][-1] == ""


def test_trust_states_errors_and_closed_forms() -> None:
    result = wave().assign(
        stefan_frost_depth=((), 2.345, {"units": "m", "long_name": "Stefan", "comment": "leaves out the heat stored"}),
        index=((), 800.0 * 86400.0, {"units": "K s", "long_name": "index", "comment": "of one winter"}),
        absent=((), np.nan, {"units": "m", "long_name": "other", "comment": "left out: no frost"}),
        input_secret=((), 1.0, {"comment": "an input"}),
    )
    rows = {row[0]: row[1:] for row in trust(result, SI)}
    assert rows["Frost depth, numerical error"][0] == "0.02 m"
    assert rows["Depth of frozen ground, numerical error"][0] == "below 0.01 m"
    assert rows["Stefan"] == ("2.35 m", "leaves out the heat stored")
    assert rows["index"][0] == "800 K days"
    assert rows["other"][0] == "left out"
    assert "input_secret" not in rows
    assert rows["Output every"][0] == "1 day"
    us = {row[0]: row[1:] for row in trust(result, display("us"))}
    assert us["Stefan"][0] == "7.7 ft"
    assert us["index"][0] == "1440 °F days"
    bare = [row[0] for row in trust(wave(errors=False), SI)]
    assert not any("error" in text for text in bare)


def test_heat_balance_is_stated_where_it_can_be() -> None:
    result = wave(days=10)
    flux = np.full(10, 2.0)
    content = np.concatenate([[0.0], np.cumsum(flux[1:] * 86400.0)])
    result = result.assign(
        surface_heat_flux=("time", flux), base_heat_flux=("time", np.zeros(10)), heat_content=("time", content * 1.01)
    )
    rows = {row[0]: row[1] for row in trust(result, SI)}
    assert rows["Heat balance"] == "closes to 1e-02"
