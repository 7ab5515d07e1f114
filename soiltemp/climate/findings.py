"""What the checks of a record found: single findings with their dates, and the report that holds them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import pandas as pd

from soiltemp.climate.moments import interval_text, show_moment

__all__ = ["TAKEN_OUT", "Finding", "QualityReport", "each_run", "runs_of"]

Times = npt.NDArray[np.datetime64]

TAKEN_OUT = "treated as missing"
"""What is done about values that cannot be used."""

_MOST_SHOWN = 10  # findings of one kind in the table


@dataclass(frozen=True, slots=True)
class Finding:
    """One thing found in a record: what, from when to when, how often, and what was done about it."""

    kind: str
    first: np.datetime64 | None
    last: np.datetime64 | None
    count: int
    text: str
    action: str

    def when(self) -> str:
        """Its time, or first and last; empty where it has none."""
        if self.first is None:
            return ""
        later = "" if self.last is None or self.last == self.first else f" to {show_moment(self.last)}"
        return f"{show_moment(self.first)}{later}"


@dataclass(frozen=True, slots=True)
class QualityReport:
    """What the checks of a record found, and what the record covers after them."""

    source: str
    first: np.datetime64
    last: np.datetime64
    interval: float
    samples: int
    filled: int
    """Values that were not measured."""
    findings: tuple[Finding, ...]
    reading: str = ""
    """Which column was read, in which unit, and where the unit is stated."""
    by_climatology: int = 0
    """Those of the filled values that climatology plus anomaly gave; the others are interpolated."""
    not_judged: str = ""
    """Which checks could not be made, and why."""

    def of_kind(self, kind: str) -> tuple[Finding, ...]:
        """Findings of one kind."""
        return tuple(finding for finding in self.findings if finding.kind == kind)

    def to_dataframe(self) -> pd.DataFrame:
        """All findings as a table, one a row.

        Returns
        -------
        pandas.DataFrame
            ``kind``, ``first`` and ``last`` (datetime64, NaT where a finding has no time), ``count``, ``text`` (what
            was found), ``action`` (what was done about it).
        """
        never = np.datetime64("NaT", "s")
        return pd.DataFrame(
            {
                "kind": pd.Series([finding.kind for finding in self.findings], dtype=object),
                "first": np.array(
                    [never if f.first is None else f.first for f in self.findings], dtype="datetime64[s]"
                ),
                "last": np.array([never if f.last is None else f.last for f in self.findings], dtype="datetime64[s]"),
                "count": np.array([finding.count for finding in self.findings], dtype=np.int64),
                "text": pd.Series([finding.text for finding in self.findings], dtype=object),
                "action": pd.Series([finding.action for finding in self.findings], dtype=object),
            }
        )

    def table(self) -> tuple[str, ...]:
        """Lines of text: a summary, the column that was read, then one line a finding.

        Returns
        -------
        tuple of str
            Plain ASCII, to print or to keep with a result; of a kind found often the first ten, and how many more.
        """
        filled = f"{self.filled - self.by_climatology} interpolated"
        filled += f", {self.by_climatology} by climatology plus anomaly" if self.by_climatology else ""
        head = (
            f"{self.source}: {self.samples} values every {interval_text(self.interval)}, "
            f"{show_moment(self.first)} to {show_moment(self.last)}, {filled}"
        )
        lines = [_ascii(head), *([_ascii(self.reading)] if self.reading else [])]
        if not self.findings:
            lines.append("nothing to report")
        by_kind: dict[str, list[Finding]] = {}
        for finding in self.findings:
            by_kind.setdefault(finding.kind, []).append(finding)
            if len(by_kind[finding.kind]) > _MOST_SHOWN:
                continue
            parts = (finding.kind.replace("_", " "), str(finding.count), finding.when(), finding.text, finding.action)
            lines.append(_ascii("{:<18} {:>6}  {:<36} {}; {}".format(*parts)))
        for kind, found in by_kind.items():
            rest = found[_MOST_SHOWN:]
            if rest:
                times = [finding.last for finding in rest if finding.last is not None]
                until = f", the last to {show_moment(max(times))}" if times else ""
                lines.append(f"{kind.replace('_', ' ')}: {len(rest)} more of this kind{until}")
        if self.not_judged:
            lines.append(_ascii(f"not judged: {self.not_judged}"))
        return tuple(lines)


def _ascii(text: str) -> str:
    return text.encode("ascii", "backslashreplace").decode("ascii").rstrip()


def each_run(kind: str, times: Times, hit: npt.NDArray[np.bool_], text: str, action: str) -> tuple[Finding, ...]:
    """One finding for each unbroken run of values that are hit, so that each has its own date.

    Examples
    --------
    >>> days = np.datetime64("2020-01-01", "s") + np.arange(5) * np.timedelta64(86400, "s")
    >>> found = each_run("gap", days, np.array([True, True, False, False, True]), "none", "told")
    >>> [(finding.when(), finding.count) for finding in found]
    [('2020-01-01 to 2020-01-02', 2), ('2020-01-05', 1)]
    """
    runs = [times[first:after] for first, after in runs_of(hit)]
    return tuple(Finding(kind, run.min(), run.max(), int(run.size), text, action) for run in runs)


def runs_of(hit: npt.NDArray[np.bool_]) -> list[tuple[int, int]]:
    """Beginning and end (behind the last) of each unbroken run of values that are hit.

    Examples
    --------
    >>> runs_of(np.array([True, True, False, False, True]))
    [(0, 2), (4, 5)]
    """
    edges = np.flatnonzero(np.diff(np.concatenate([[False], hit, [False]]).astype(np.int8)))
    return list(zip(edges[::2].tolist(), edges[1::2].tolist(), strict=True))
