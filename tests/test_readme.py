"""The README says what is so: its example runs, its site file is read, its printed numbers are those of the run."""

import contextlib
import io
import pathlib
import re

import pytest

from soiltemp.cli import main
from soiltemp.site import parse_site

ROOT = pathlib.Path(__file__).parents[1]
TEXT = (ROOT / "README.md").read_text(encoding="utf-8")


def block(language: str, number: int = 0) -> str:
    """A fenced block of the README by its language and its place among those."""
    fenced = re.findall(r"^```(\w*)\n(.*?)^```$", TEXT, re.DOTALL | re.MULTILINE)
    return [text for name, text in fenced if name == language][number]


def test_python_example(tmp_path: pathlib.Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    printed = io.StringIO()
    names: dict[str, object] = {}
    with contextlib.redirect_stdout(printed):
        exec(compile(block("python"), "README.md", "exec"), names)
    frost, coldest = printed.getvalue().splitlines()
    assert frost == "frost to 1.37 m"
    assert [float(word) for word in coldest.strip("[]").split()] == pytest.approx([-1.50, 0.71], abs=0.02)
    assert (tmp_path / "result.nc").stat().st_size > 10_000


def test_python_example_of_winters(tmp_path: pathlib.Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "example_sites").symlink_to(ROOT / "example_sites")
    monkeypatch.chdir(tmp_path)
    printed = io.StringIO()
    names: dict[str, object] = {}
    with contextlib.redirect_stdout(printed):
        exec(compile(block("python") + block("python", 1), "README.md", "exec"), names)
    *_, design, frost, margin = printed.getvalue().splitlines()
    assert design == "1394 K day, mean of the 3 coldest winters in 30 (1995-96, 2006-07, 2005-06)"
    assert float(re.findall(r"[\d.]+", frost)[0]) == pytest.approx(1.1, abs=0.15)
    assert margin == "margin 0.35 m"


def test_site_file_is_read() -> None:
    site = parse_site(block("toml"), folder=ROOT / "example_sites")
    assert site.profile.base == pytest.approx(20.0)
    assert site.line is not None
    assert site.line.cover == pytest.approx(1.8288)


@pytest.mark.parametrize(
    ("number", "title", "site"), [(2, "Wether Lane water main", "wether_lane"), (4, "Winters", "osier_flats")]
)
def test_printed_numbers_are_those_of_the_run(
    number: int, title: str, site: str, capsys: pytest.CaptureFixture[str]
) -> None:
    """The last digit may differ on another processor or with other versions of the libraries."""
    shown = block("", number)
    assert title in shown
    assert main(["run", str(ROOT / "example_sites" / f"{site}.toml"), "--quiet"]) == 0
    said = capsys.readouterr().out
    if site == "osier_flats":  # what an engineer must not miss
        assert "the record may have a step" in said
        assert "may reach the crown of the line at 1.10 m" in said
    for line in shown.splitlines():
        numbers = [float(word) for word in re.findall(r"(?<![\w-])\d+\.\d+", line)]
        label = line.split("  ")[1 if line.startswith("  ") else 0].strip() if line.strip() else ""
        if not numbers or not label:
            continue
        rows = [row for row in said.splitlines() if row.strip().split("  ")[0] == label or row.strip() == label]
        found = next(row for row in rows or said.splitlines() if row.strip().startswith(label))
        assert [float(word) for word in re.findall(r"(?<![\w-])\d+\.\d+", found)] == pytest.approx(
            numbers, abs=0.011
        ), line
