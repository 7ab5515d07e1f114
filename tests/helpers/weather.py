"""Invented air records: a periodic climate with weather on it that remembers itself."""

from __future__ import annotations

import numpy as np
import xarray as xr

DAY = 86400.0
GREGORIAN = 365.2425


def record(
    start: str,
    days: int,
    *,
    mean: float = 5.0,
    amplitude: float = 14.0,
    coldest: str = "2000-01-20",
    noise: float = 0.0,
    memory: float = 0.0,
    seed: int = 1,
    every: str = "D",
) -> xr.DataArray:
    """Daily means (every="D") or hourly points (every="h"); `memory` is the correlation from one value to the next."""
    step = np.timedelta64(1, every)
    count = days if every == "D" else 24 * days + 1
    times = np.datetime64(start, "ns") + np.arange(count) * step
    middle = times + (np.timedelta64(12, "h") if every == "D" else np.timedelta64(0, "h"))
    phase = (middle - np.datetime64(coldest, "ns")) / np.timedelta64(1, "ns") / 1e9 / DAY / GREGORIAN
    values = mean - amplitude * np.cos(2 * np.pi * phase) + noise * persistent(count, memory, seed)
    labels = {"cell_methods": "time: mean", "interval": "1 D"} if every == "D" else {"cell_methods": "time: point"}
    return xr.DataArray(values, {"time": times}, "time", attrs={"units": "degree_Celsius", **labels})


def persistent(count: int, memory: float, seed: int) -> np.ndarray:
    """Noise with unit variance, each value `memory` times the one before and something new."""
    from scipy.signal import lfilter

    fresh = np.random.default_rng(seed).normal(size=count + 500)
    return lfilter([np.sqrt(1 - memory**2)], [1.0, -memory], fresh)[500:]


def daily(start: str, celsius: list[float] | np.ndarray) -> xr.DataArray:
    """Daily means from `start` on."""
    times = np.datetime64(start, "ns") + np.arange(len(celsius)) * np.timedelta64(1, "D")
    return xr.DataArray(np.asarray(celsius, dtype=float), {"time": times}, "time", attrs={"cell_methods": "time: mean"})
