"""How fast, and beside what: one run times everything on this machine and prints Markdown tables and verdicts.

    python -m tests.benchmarks.peers                    everything, about a minute
    python -m tests.benchmarks.peers --only solvers blocks --repeats 9

Fastest of several repeats each; ratios are of times taken in the same run. Parts: solvers, blocks, cycle, winters,
import, run.
"""

from __future__ import annotations

import argparse
import os
import platform
import subprocess
import sys
import tempfile
import time
from itertools import pairwise
from pathlib import Path

import numba
import numpy as np

from soiltemp import Material
from soiltemp.column import Column, build_column
from soiltemp.ground import Layer, Profile
from soiltemp.isotherm import deepest_frost
from soiltemp.solver.cycle import find_cycle
from soiltemp.solver.march import make_schedule, march, march_block
from soiltemp.surface import forcing_knots
from tests.benchmarks import case, rivals

ROOT = Path(__file__).parents[2]


def verdict(promise: str, met: bool, found: str) -> None:
    """One line a promise."""
    print(f"- {'met' if met else 'NOT MET'}: {promise}; found {found}")


def row(*cells: str) -> None:
    """A line of a Markdown table."""
    print("| " + " | ".join(cells) + " |")


def solvers(repeats: int) -> None:
    """The case by our solver and by the rivals."""
    case.ours(3600.0)  # compile
    ours = case.ours(3600.0, repeats=repeats)
    careful = case.ours(3600.0, 0.2, repeats=repeats)
    print(f"\nA year, hourly surface, 95 elements to 20 m, frost to {case.frost_reached():.2f} m\n")
    row("method", "surface", "time", "times ours", "largest error below 0.3 m", "work")
    row("---", "---", "---:", "---:", "---:", "---")

    def told(name: str, timed: case.Timed) -> case.Timed:
        row(
            name, timed.surface, f"{timed.seconds * 1e3:.1f} ms", f"{timed.seconds / ours.seconds:.1f}",
            f"{timed.error:.4f} K", timed.note,
        )  # fmt: skip
        return timed

    told("soiltemp, steps of 1 h", ours)
    told("soiltemp, steps of 1 h, tolerance 0.2 K (default)", careful)
    told("soiltemp, steps of 15 min", case.ours(900.0, repeats=repeats))
    few = max(1, repeats // 3)
    best: dict[str, case.Timed] = {}
    for form in rivals.FORMS:
        for surface in rivals.SURFACES:
            name = f"SciPy LSODA, banded, rtol 1e-4, atol 1e-3, max_step 6 h; state {form}"
            timed = told(name, rivals.lsoda(form, surface, 1e-4, 1e-3, 6 * 3600.0, few))
            if surface == "hourly record":
                best[f"lsoda {form}"] = timed
            for rtol in (1e-4, 5e-5, 2e-5, 1e-5):
                name = f"SUNDIALS CVODE, banded, rtol {rtol:g}; state {form}"
                timed = told(name, rivals.cvode(form, surface, rtol, 10 * rtol, 6 * 3600.0, few))
                if surface == "hourly record" and form == "heat content" and timed.error <= ours.error:
                    best.setdefault("cvode", timed)
    told("numpy and solve_banded, 1 h, properties of the step before", rivals.by_hand(few))
    steps = round(case.YEAR / 3600.0)
    sweep = rivals.thomas(steps, repeats)
    row("bare linear Thomas sweep, one a step, no freezing, no output", "none", f"{sweep * 1e3:.1f} ms",
        f"{sweep / ours.seconds:.2f}", "none", f"{steps} sweeps")  # fmt: skip
    print()
    for form in rivals.FORMS:
        lsoda = best[f"lsoda {form}"]
        verdict(f"200 times as fast as LSODA (state {form}, {lsoda.error:.3f} K)", lsoda.seconds >= 200 * ours.seconds,
                f"{lsoda.seconds / ours.seconds:.0f}")  # fmt: skip
    if "cvode" in best:
        ratio = best["cvode"].seconds / ours.seconds
        verdict("50 times as fast as CVODE at no greater error", ratio >= 50, f"{ratio:.0f}")
    else:
        verdict("50 times as fast as CVODE at no greater error", False, "no tolerance of those tried was as accurate")
    verdict("at most 4 bare Thomas sweeps", ours.seconds <= 4 * sweep, f"{ours.seconds / sweep:.2f}")


def blocks(repeats: int, columns: int = 1000) -> None:
    """A thousand different columns for a year, on one core and on two, beside one column."""
    # GNU OpenMP starts fewer threads on a machine that had something else to do in the last quarter of an hour
    numba.config.THREADING_LAYER = "workqueue"
    cores = min(2, os.cpu_count() or 1)
    numba.set_num_threads(cores)
    rng = np.random.default_rng(1)
    tables = []
    for _ in range(columns):
        k, c = rng.uniform(0.8, 2.2), rng.uniform(2.2e6, 3.2e6)
        tables.append(
            case.column(Material("ground", k, 1.4 * k, c, 0.75 * c, rng.uniform(4e7, 1.6e8), freezing_range=0.5)).table
        )
    stacked = np.stack(tables)
    days = 365
    seconds = np.arange(0.0, days * case.DAY + 1, 3600.0)
    # columns cross their knots at different times: mild and cold places, and ground that freezes slowly and fast
    surfaces = np.stack([case.surface_at(seconds) + shift for shift in np.linspace(-3.0, 3.0, 10)])
    schedule = make_schedule(seconds, surfaces[0], np.arange(0.0, seconds[-1] + 1, 30 * case.DAY), max_step=3600.0)
    which, forced_by = np.arange(columns), rng.integers(0, 10, columns)
    start = np.full((columns, stacked.shape[1]), 8.0)

    def run(threads: str, count: int = columns):
        return march_block(
            stacked, which[:count], schedule, surfaces, forced_by[:count], start[:count], base_flux=np.zeros(count),
            watch=1, tolerance=np.inf, threads=threads,
        )  # fmt: skip

    def single():
        for n in range(0, columns, columns // 10):
            own = make_schedule(seconds, surfaces[forced_by[n]], schedule.seconds[schedule.row >= 0], max_step=3600.0)
            march(stacked[n], own, start[n], base_flux=0.0, watch=1, tolerance=np.inf)

    for threads in ("serial", "parallel"):
        run(threads, 40)  # compile
    single()
    few = max(2, repeats // 4)
    one, _ = case.fastest(single, repeats)
    one /= 10
    serial, first = case.fastest(lambda: run("serial"), few)
    parallel, second = case.fastest(lambda: run("parallel"), few)
    same = np.array_equal(first.temperature, second.temperature)
    print(f"\n{columns} columns of different ground, 10 surfaces, {days} days of hours, 95 elements\n")
    row("way", "time a column", "times one column alone")
    row("---", "---:", "---:")
    row("one column alone", f"{one * 1e3:.2f} ms", "1")
    row("in a block, one core", f"{serial / columns * 1e3:.2f} ms", f"{serial / columns / one:.2f}")
    row(f"in a block, {cores} cores", f"{parallel / columns * 1e3:.2f} ms", f"{parallel / columns / one:.2f}")
    print()
    verdict("a column in a block takes a third of one alone, or less", serial / columns <= one / 3,
            f"1/{one * columns / serial:.2f}")  # fmt: skip
    verdict("two cores are 1.7 times one", serial >= 1.7 * parallel, f"{serial / parallel:.2f} (bits equal: {same})")


def cycle(repeats: int) -> None:
    """The periodic start beside plain marching."""
    ground = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 110e6)
    column = build_column(Profile([Layer(ground, 30.0)]), frost_zone=2.0)
    seconds = np.arange(0.0, case.YEAR + 1, 6 * 3600.0)
    surface = 5.0 - 17.0 * np.cos(2 * np.pi * (seconds / case.DAY - 20) / 365)
    schedule = make_schedule(seconds, surface, np.linspace(0.0, case.YEAR, 25), max_step=6 * 3600.0)
    settings = {"base_flux": 0.0, "watch": 1, "tolerance": 0.1}
    least, found = case.fastest(lambda: find_cycle(column.table, schedule, **settings), repeats)
    limit = found.temperature
    for _ in range(300):
        limit = march(column.table, schedule, limit, **settings).end
    state, years = np.full(column.depths.size, 5.0), 0
    while np.abs(state - limit).max() > 0.01 and years < 1000:
        state, years = march(column.table, schedule, state, **settings).end, years + 1
    off = float(np.abs(found.temperature - limit).max())
    print("\nPeriodic steady state, 30 m of silt, seasonal frost\n")
    row("way", "simulated years", "off the limit")
    row("---", "---:", "---:")
    row(f"soiltemp, {least * 1e3:.0f} ms", str(found.periods), f"{off:.4f} K")
    row("plain marching from the mean", str(years), "0.01 K")
    print()
    verdict("within 0.01 K in at most 12 years", off <= 0.01 and found.periods <= 12, f"{off:.4f} K in {found.periods}")


def winters(repeats: int) -> None:
    """Frost of each of 30 winters of a daily record, beside LSODA on one of them."""
    from soiltemp.climate import read_record
    from soiltemp.study import solve

    air = read_record(
        ROOT / "example_sites" / "osier_flats_weather.csv", column=("t_min [degC]", "t_max [degC]"),
        start="1981-07-01", end="2011-07-01", longest_gap="20 days",
    )  # fmt: skip
    profile = Profile([Layer(case.MATERIAL, 20.0)])
    edges = np.arange("1981", "2012", dtype="datetime64[Y]") + np.timedelta64(6, "M")

    def ours(step: str):
        result = solve(profile, air, initial=case.START, depths=[1.0], max_step=step, numerical_error="left out")
        times = np.searchsorted(result["time"].values, edges.astype("datetime64[ns]"))
        return [float(result.frost_depth.values[a:b].max()) for a, b in pairwise(times)]

    # its coldest winter alone, on the same grid: what LSODA takes for it, and how far either is from steps of 60 s
    seconds, celsius, _ = forcing_knots(air)
    first = np.searchsorted(seconds, np.arange(30) * case.YEAR)
    coldest = int(np.argmin([np.minimum(celsius[a : a + 730], 0.0).sum() for a in first]))
    knots = slice(first[coldest], first[coldest] + 731)
    seconds, celsius = seconds[knots] - seconds[knots][0], celsius[knots]
    grid = solve(profile, air.isel(time=slice(0, 800)), initial=case.START, numerical_error="left out").depth.values
    column = Column(profile, grid, np.zeros(grid.size - 1, dtype=np.int64))

    def one(step: float) -> np.ndarray:
        schedule = make_schedule(seconds, celsius, np.arange(0.0, seconds[-1] + 1.0, case.DAY), max_step=step)
        start = np.full(grid.size, case.START)
        return march(column.table, schedule, start, base_flux=0.0, watch=1, tolerance=0.2).temperature

    exact = one(60.0)
    deep = grid > case.READ_FROM

    def told(name: str, taken: float, temperature: np.ndarray) -> None:
        """A row: what a way takes, and how far its coldest winter is from steps of 60 s, the surface node left out."""
        miss = np.abs(temperature - exact[:, 1:])[:, deep[1:]].max()
        frost = np.abs(deepest_frost(grid[1:], temperature).max() - deepest_frost(grid[1:], exact[:, 1:]).max())
        row(name, f"{taken:.2f} s", f"{taken / times['1h']:.2f}", f"{miss:.3f} K", f"{1e3 * frost:.1f} mm")

    print("\n30 winters of a daily record, 210 elements to 20 m\n")
    row("way", "time for 30 winters", "times ours", "coldest winter: largest error below 0.3 m", "error of its frost")
    row("---", "---:", "---:", "---:", "---:")
    ours("2h")  # compile
    times, depths = {}, []
    for step, length in (("1h", 3600.0), ("2h", 7200.0)):
        times[step], depths = case.fastest(lambda step=step: ours(step), repeats)
        told(f"soiltemp, solve() with labels, steps of {step}", times[step], one(length)[:, 1:])
    whole: dict[str, float] = {}
    for form in rivals.FORMS:
        lsoda, found = rivals.lsoda_winter(form, grid, seconds, celsius, max(1, repeats // 3))
        whole[form] = 30 * lsoda
        told(f"SciPy LSODA, banded, state {form}, 30 times its coldest", whole[form], found)
    print(f"\nfrost {min(depths):.2f} to {max(depths):.2f} m\n")
    least = times["1h"]
    verdict("30 winters within 1 s", least <= 1.0, f"{least:.2f} s")
    for form, taken in whole.items():
        verdict(f"100 times as fast as LSODA (state {form})", taken >= 100 * least,
                f"{taken / least:.0f} by steps of 1 h, {taken / times['2h']:.0f} by steps of 2 h")  # fmt: skip


def _python(code: str, repeats: int) -> float:
    """Least time of a fresh interpreter with some code [s]."""
    return case.fastest(lambda: subprocess.run([sys.executable, "-c", code], cwd=ROOT, check=True), repeats)[0]


def importing(repeats: int) -> None:
    """Import time beside that of the libraries it stands on."""
    count = max(5, repeats)
    base = _python("import xarray, numba", count)
    ours = _python("import soiltemp", count)
    print("\nImport, fresh interpreter\n")
    row("code", "time", "times")
    row("---", "---:", "---:")
    row("import xarray, numba", f"{base:.3f} s", "1")
    row("import soiltemp", f"{ours:.3f} s", f"{ours / base:.2f}")
    print()
    verdict("import at most 1.2 times that of xarray and numba", ours <= 1.2 * base, f"{ours / base:.2f}")


def running(repeats: int) -> None:
    """`soiltemp run` on each example, second run: compiled code is on disk by then."""
    print("\n`soiltemp run`, compiled before\n")
    row("site", "time")
    row("---", "---:")
    slowest = 0.0
    with tempfile.TemporaryDirectory() as folder:
        for site in sorted((ROOT / "example_sites").glob("*.toml")):
            command = [
                sys.executable, "-c", "import sys; from soiltemp.cli import main; sys.exit(main())", "run", str(site),
                "-o", f"{folder}/{site.stem}.nc",
            ]  # fmt: skip

            def once(command: list[str] = command) -> None:
                subprocess.run(command, cwd=ROOT, check=True, capture_output=True)

            once()
            least, _ = case.fastest(once, max(2, repeats // 3))
            slowest = max(slowest, least)
            row(site.name, f"{least:.2f} s")
    print()
    verdict("an example runs within 5 s", 0.0 < slowest <= 5.0, f"{slowest:.2f} s")


PARTS = {
    "solvers": solvers,
    "blocks": blocks,
    "cycle": cycle,
    "winters": winters,
    "import": importing,
    "run": running,
}


def main() -> None:
    """Read the options and run the parts."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--only", nargs="+", choices=PARTS, default=list(PARTS), help="parts to run")
    parser.add_argument("--repeats", type=int, default=9, help="repeats of what is quick; a third for what is slow")
    options = parser.parse_args()
    begin = time.perf_counter()
    print(
        f"{platform.processor() or platform.machine()}, {os.cpu_count()} cores, load {os.getloadavg()[0]:.1f}; "
        f"Python {platform.python_version()}, numpy {np.__version__}, numba {numba.__version__}"
    )
    for part in options.only:
        PARTS[part](options.repeats)
    print(f"\n{time.perf_counter() - begin:.0f} s in all")


if __name__ == "__main__":
    main()
