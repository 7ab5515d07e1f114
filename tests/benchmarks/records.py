"""How fast forty years of hours are read and checked, beside what pandas takes for the bare table, in one run.

    python -m tests.benchmarks.records
    python -m tests.benchmarks.records --years 10 --repeats 9

Fastest of several repeats each; ratios are of times taken in turn in the same run.
"""

from __future__ import annotations

import argparse
import os
import platform
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd

from soiltemp.climate import read_checked
from tests.helpers.invented import hours_of_years, write_hours

CALMEST = "2 times the bare pandas.read_csv plus 1 s"


def seconds_of(work: Callable[[], object]) -> float:
    """Time of one call."""
    start = time.perf_counter()
    work()
    return time.perf_counter() - start


def main() -> None:
    """Write the records, time both readers in turn, print a Markdown table and whether the promises hold."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--years", type=int, default=40)
    parser.add_argument("--repeats", type=int, default=5)
    chosen = parser.parse_args()
    times, celsius = hours_of_years(chosen.years)
    faulty = celsius.copy()
    faulty[::5003] = np.nan  # 70 gaps in 40 years
    faulty[faulty.size // 2 :] += 2.0
    print(f"{chosen.years} years of hours, {times.size} rows; Python {platform.python_version()}, "
          f"numpy {np.__version__}, pandas {pd.__version__}, {os.cpu_count()} cores\n")  # fmt: skip
    print("| file | MB | bare pandas.read_csv | with dates | read and checked | times bare |")
    print("| --- | ---: | ---: | ---: | ---: | ---: |")
    verdicts = []
    with tempfile.TemporaryDirectory() as folder:
        forms = {
            "plain": (celsius, {}),
            "with gaps and a step": (faulty, {}),
            "with quotation marks": (celsius, {"quoted": True}),
            "days like 1/31/1980": (celsius, {"slashes": True}),
        }
        for name, (values, more) in forms.items():
            path = Path(folder, "air.csv")
            write_hours(path, times, values, **more)
            bare, dated, ours = [], [], []
            for _ in range(chosen.repeats):
                bare.append(seconds_of(lambda path=path: pd.read_csv(path)))
                dated.append(seconds_of(lambda path=path: pd.read_csv(path, parse_dates=[0])))
                ours.append(seconds_of(lambda path=path: read_checked(path, time_zone="UTC")))
            best = min(bare), min(dated), min(ours)
            megabytes = path.stat().st_size / 1e6
            print(f"| {name} | {megabytes:.1f} | {best[0]:.2f} s | {best[1]:.2f} s | {best[2]:.2f} s "
                  f"| {best[2] / best[0]:.1f} |")  # fmt: skip
            limit = 2.0 * best[0] + 1.0
            verdicts.append((name, best[2] <= 5.0, best[2] <= limit, best[2], limit))
    print()
    for name, is_fast, is_close, found, limit in verdicts:
        print(f"- {'met' if is_fast else 'NOT MET'}: {name}: at most 5 s; found {found:.2f} s")
        print(f"- {'met' if is_close else 'NOT MET'}: {name}: at most {CALMEST} ({limit:.2f} s); found {found:.2f} s")


if __name__ == "__main__":
    main()
