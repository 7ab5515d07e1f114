"""The design freezing index: how cold a winter to design for, by the practices in use, each with its source."""

from __future__ import annotations

import tomllib
from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cache
from importlib import resources
from typing import Any, Literal

import numpy as np
import xarray as xr

from soiltemp.climate.bootstrap import Bootstrap, return_values
from soiltemp.climate.extremes import ExtremeFit, fit_gev, fit_gumbel, winter_values
from soiltemp.climate.gev import Distribution, Method
from soiltemp.climate.moments import counted, show_value
from soiltemp.constants import DAY, HOUR
from soiltemp.errors import InputError, message

__all__ = ["DesignIndex", "Practice", "design_freezing_index", "design_practices", "freezing_indices"]

Definition = Literal["curve", "sum"]

VARIABLES = {"curve": "freezing_index", "sum": "freezing_degree_days"}
"""Variable of :func:`soiltemp.climate.winters` for each definition of the index, without its first word."""


@dataclass(frozen=True, slots=True)
class Practice:
    """A published practice: so many coldest winters of so many, or a distribution."""

    name: str
    long_name: str
    short_name: str
    source: str
    coldest: int = 0
    """Number of winters that are averaged, 0 for a distribution."""
    winters: int = 0
    """Number of latest winters looked at, 0 for all."""
    fallback: str = ""
    """Practice that the source allows where the record is shorter."""
    distribution: Distribution | None = None
    definition: str = ""
    """Definition of the index that the practice prescribes; empty where it leaves it open."""


@dataclass(frozen=True)
class DesignIndex:
    """A design freezing index, and everything needed to defend it."""

    value: float
    """Freezing index [K s]."""
    practice: Practice
    """The practice that was applied; that of the fallback where the record was too short."""
    definition: str
    """"curve" or "sum"."""
    of: str
    """"air" or "surface"."""
    winters: tuple[str, ...]
    """Labels of the winters looked at."""
    coldest: tuple[str, ...]
    """Labels of the winters that are averaged, coldest first; empty of a distribution."""
    return_period: float | None = None
    """Mean number of winters between exceedances."""
    low: float | None = None
    """Lower end of the interval of confidence [K s]; None of a count of winters."""
    high: float | None = None
    """Upper end of the interval of confidence [K s]."""
    confidence: float | None = None
    fit: ExtremeFit | None = None
    notes: tuple[str, ...] = ()
    """What a reader must know: winters left out, extrapolation, a fallback."""
    unit: str = field(default="K s", init=False)

    @property
    def degree_days(self) -> float:
        """Value [K day]."""
        return self.value / DAY

    @property
    def kelvin_hours(self) -> float:
        """Value [K h], as ISO 13793 writes it."""
        return self.value / HOUR

    def __str__(self) -> str:
        text = f"{self.degree_days:.0f} K day"
        if self.low is not None and self.high is not None and self.confidence is not None:
            text += f" ({100 * self.confidence:g} % interval {self.low / DAY:.0f} to {self.high / DAY:.0f})"
        text += f", {self.practice.long_name}"
        text += f", {self.return_period:g} winters" if self.return_period is not None else ""
        text += f" ({', '.join(self.coldest)})" if self.coldest else ""
        return text


@cache
def design_practices() -> dict[str, Practice]:
    """Every practice for the design freezing index, by name.

    Returns
    -------
    dict
        Name -> :class:`Practice`, in the order of the table.

    Examples
    --------
    >>> design_practices()["mean_of_3_coldest_in_30"].fallback
    'coldest_in_10'
    """
    text = resources.files("soiltemp.climate").joinpath("design_practices.toml").read_text(encoding="utf-8")
    return {row["name"]: Practice(**row) for row in tomllib.loads(text)["practice"]}


def design_freezing_index(
    winters: xr.Dataset | xr.DataArray | Sequence[float],
    practice: str,
    *,
    definition: Definition = "curve",
    of: Literal["air", "surface"] = "air",
    return_period: float | None = None,
    method: Method = "l-moments",
    shorter_record: Literal["refuse", "as the source allows"] = "refuse",
    confidence: float = 0.9,
    bootstrap: Bootstrap = "parametric",
    samples: int = 1000,
    seed: int = 1,
) -> DesignIndex:
    """Design freezing index of a record by a published practice.

    Parameters
    ----------
    winters : xarray.Dataset
        As :func:`soiltemp.climate.winters` gives it; only whole winters are used. Or the indices themselves, one a
        winter in the order of time: a DataArray or a sequence [K s].
    practice : str
        Name in :func:`design_practices`: "mean_of_3_coldest_in_30", "coldest_in_10", "coldest_in_30",
        "mean_of_5_coldest_in_30", "return_period_gumbel", "return_period_gev", "iso_13793".
    definition : {"curve", "sum"}
        Index by the cumulative degree-day curve, or sum of all degrees below 0 degC; they differ much where winters
        are mild, and are never mixed.
    of : {"air", "surface"}
        Whose index.
    return_period : float, optional
        Mean number of winters between exceedances, for the practices with a distribution (n of F_n).
    method, confidence, bootstrap, samples, seed
        Of :func:`soiltemp.climate.fit_gev` and :func:`soiltemp.climate.return_values`.
    shorter_record : {"refuse", "as the source allows"}
        What is done where the record has fewer winters than the practice wants: nothing but this sentence, or the
        practice that the source itself names for that case.

    Returns
    -------
    DesignIndex

    Raises
    ------
    InputError, UnitError
        Too few winters for the question, an unknown practice, or a return period where none belongs.

    Notes
    -----
    Counts take the latest whole winters on record. What the ground gets is the surface index, which an n-factor
    makes of that of the air.

    References
    ----------
    The source of each practice stands in the result.

    Examples
    --------
    >>> indices = [86400.0 * number for number in range(300, 600, 10)]
    >>> print(design_freezing_index(indices, "mean_of_3_coldest_in_30"))
    580 K day, mean of the 3 coldest winters in 30 (winter 30, winter 29, winter 28)
    """
    rule = _practice(practice)
    _check_words(definition, of, shorter_record, rule)
    values, notes = freezing_indices(winters, definition=definition, of=of)
    if rule.distribution is None:
        if return_period is not None:
            found = f"{show_value(return_period)} for {rule.name}"
            remedy = "leave it out, or take return_period_gumbel or return_period_gev"
            raise InputError(message("return_period", found, "none: the practice counts winters", remedy))
        return _counted(rule, values, notes, definition, of, shorter_record)
    if return_period is None:
        remedy = "state it, as return_period=50"
        raise InputError(message("return_period", "none", "a number of winters above 1", remedy))
    fit = (fit_gumbel if rule.distribution == "gumbel" else fit_gev)(values, method=method)
    rare = return_values(
        fit, return_period, confidence=confidence, bootstrap=bootstrap, samples=samples, seed=seed
    ).isel(return_period=0)
    notes += _doubts(fit, float(return_period), rule, winters)
    return DesignIndex(
        value=float(rare["return_value"]),
        practice=rule,
        definition=definition,
        of=of,
        winters=_labels(values),
        coldest=(),
        return_period=float(return_period),
        low=float(rare["return_value_low"]),
        high=float(rare["return_value_high"]),
        confidence=float(confidence),
        fit=fit,
        notes=notes,
    )


def freezing_indices(
    winters: Any, *, definition: Definition = "curve", of: str = "air"
) -> tuple[xr.DataArray, tuple[str, ...]]:
    """Freezing indices of the whole winters, and notes on those left out.

    Parameters
    ----------
    winters : xarray.Dataset, xarray.DataArray or sequence of float
        As :func:`design_freezing_index` takes it.
    definition, of : str
        As there.

    Returns
    -------
    values : xarray.DataArray
        Index [K s] over ``winter``, with ``winter_label``.
    notes : tuple of str

    Raises
    ------
    InputError, UnitError
        No whole winter, or a dataset without such an index.

    Examples
    --------
    >>> freezing_indices([3.0, 4.0])[0].winter_label.values.tolist()
    ['winter 1', 'winter 2']
    """
    if definition not in VARIABLES:
        found = f"{type(definition).__name__} {show_value(definition)}"
        raise InputError(message("definition", found, '"curve" or "sum"', "take one of them"))
    if not isinstance(winters, xr.Dataset):
        numbers = winter_values(winters)
        labels = [f"winter {place}" for place in range(1, numbers.size + 1)]
        if isinstance(winters, xr.DataArray) and "winter_label" in winters.coords:
            labels = [str(label) for label in winters["winter_label"].values]
        coords = {"winter_label": ("winter", labels)}
        return xr.DataArray(numbers, dims="winter", coords=coords, attrs={"units": "K s"}), ()
    name = f"{of}_{VARIABLES[definition]}"
    if name not in winters or f"{of}_complete" not in winters:
        remedy = "give the result of soiltemp.climate.winters" + (" with surface=..." if of == "surface" else "")
        raise InputError(message("winters", f"a dataset without {name}", "one that has it", remedy))
    whole = winters[f"{of}_complete"].values == 1
    left_out = [str(label) for label in winters["winter_label"].values[~whole]]
    if not whole.any():
        found = f"{counted(whole.size, 'winter')}, none of them whole"
        remedy = "use a longer record, or fill its gaps"
        raise InputError(message("winters", found, "whole winters", remedy))
    notes = (f"not whole, and left out: {', '.join(left_out)}",) if left_out else ()
    return winters[name][whole], notes


def _practice(name: Any) -> Practice:
    known = design_practices()
    if not isinstance(name, str) or name not in known:
        found = f"{type(name).__name__} {show_value(name)}"
        raise InputError(message("practice", found, ", ".join(known), "take one of these"))
    return known[name]


def _check_words(definition: Any, of: Any, shorter_record: Any, rule: Practice) -> None:
    for name, given, allowed in (
        ("definition", definition, ("curve", "sum")),
        ("of", of, ("air", "surface")),
        ("shorter_record", shorter_record, ("refuse", "as the source allows")),
    ):
        if given not in allowed:
            found = f"{type(given).__name__} {show_value(given)}"
            raise InputError(message(name, found, " or ".join(f'"{word}"' for word in allowed), "take one of them"))
    if rule.definition and definition != rule.definition:
        found = f'"{definition}" for {rule.name}'
        remedy = "leave it out: the practice says how to count"
        raise InputError(message("definition", found, f'"{rule.definition}"', remedy))


def _labels(values: xr.DataArray) -> tuple[str, ...]:
    return tuple(str(label) for label in values["winter_label"].values)


def _counted(
    rule: Practice, values: xr.DataArray, notes: tuple[str, ...], definition: str, of: str, shorter_record: str
) -> DesignIndex:
    """A practice that averages the coldest of the latest winters."""
    if values.size < rule.winters:
        has = f"the record has {counted(values.size, 'whole winter')}, and {rule.long_name} wants {rule.winters}"
        known = design_practices()
        if rule.fallback and shorter_record != "refuse" and values.size >= known[rule.fallback].winters:
            instead = known[rule.fallback]
            notes += (f"{has}: {instead.long_name}, as its source allows",)
            return _counted(instead, values, notes, definition, of, shorter_record)
        remedy = "use a longer record, or a return period with its interval"
        if rule.fallback and values.size >= known[rule.fallback].winters:
            remedy = f'state shorter_record="as the source allows" for {known[rule.fallback].long_name}'
        found = counted(values.size, "whole winter")
        raise InputError(message(f"winters, {rule.long_name}", found, f"{rule.winters} or more", remedy))
    latest = values[-rule.winters :]
    labels = _labels(latest)
    if values.size > rule.winters:
        notes += (f"of {values.size} whole winters the latest {rule.winters} are used, {labels[0]} to {labels[-1]}",)
    if "winter" in latest.coords:
        years = np.asarray(latest["winter"].values.astype("datetime64[Y]").astype(np.int64))
        if int(years[-1] - years[0]) + 1 > rule.winters:
            notes += (f"the {rule.winters} winters come from {int(years[-1] - years[0]) + 1} years",)
    order = np.argsort(-latest.values, kind="stable")[: rule.coldest]
    value = float(latest.values[order].mean())
    if value == 0.0:
        notes += ("no winter has any frost",)
    return DesignIndex(value, rule, definition, of, labels, tuple(labels[place] for place in order), notes=notes)


def _doubts(fit: ExtremeFit, return_period: float, rule: Practice, winters: Any) -> tuple[str, ...]:
    """What to know about a return value."""
    notes: tuple[str, ...] = ()
    count = len(fit.sample)
    if return_period > count:
        notes += (f"a return period of {return_period:g} winters reaches beyond the {count} on record: extrapolated",)
    if fit.frost_free_share > 0.0:
        free = fit.sample.count(0.0)
        notes += (f"{free} of {count} winters have no frost: the distribution is that of the others",)
    if rule.name == "iso_13793" and isinstance(winters, xr.Dataset) and winters.attrs.get("interval", "1 D") != "1 D":
        notes += ("ISO 13793 counts daily means; this record has shorter intervals",)
    return notes
