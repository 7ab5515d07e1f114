"""What stops the solver: an error with its reason, and never numbers."""

import os
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from soiltemp import Layer, Material, Profile, solve
from soiltemp.errors import SolverError
from soiltemp.solver import stage
from soiltemp.solver.march import STATUS_MEANING, WINDOW, make_schedule, march
from tests.helpers.columns import DAY, HOUR, column_of, constant, inert, march_column, points, uniform
from tests.helpers.digest import digest

ROOT = Path(__file__).parents[1]
SILT = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 110e6)
COLUMN = column_of(uniform(SILT, 3.0), np.linspace(0.0, 3.0, 31))


def test_every_code_has_a_sentence():
    assert set(STATUS_MEANING) == {stage.NOT_CONVERGED, stage.NON_FINITE, stage.OUT_OF_RANGE}


def test_missing_surface_temperature():
    surface = np.full(11, 2.0)
    surface[5] = np.nan
    with pytest.raises(SolverError) as error:
        march_column(COLUMN, np.arange(11) * DAY, surface, 1.0)
    assert str(error.value).startswith("solver, 4.000 days after the start: ")
    assert str(error.value).endswith("give a smaller max_step.")
    assert "no result is returned" in str(error.value)


def test_absurd_surface_temperature():
    surface = np.full(11, 2.0)
    surface[5:] = 900.0
    with pytest.raises(SolverError, match=r"^solver, 4\.000 days after .* beyond 200 degC; no result"):
        march_column(COLUMN, np.arange(11) * DAY, surface, 1.0)


def test_missing_start_and_missing_table():
    with pytest.raises(SolverError, match=STATUS_MEANING[stage.NON_FINITE]):
        march_column(COLUMN, [0.0, DAY], [1.0, 1.0], np.where(COLUMN.depths == 1.5, np.nan, 1.0))
    table = COLUMN.table.copy()
    table[7, :, stage.B] = np.nan
    schedule = make_schedule(np.array([0.0, DAY]), np.ones(2), np.array([0.0, DAY]), max_step=HOUR)
    with pytest.raises(SolverError, match=r"^solver, 0\.000 days"):
        march(table, schedule, np.ones(31), base_flux=0.0, watch=1, tolerance=0.05)


def test_heat_flux_that_bakes_the_ground():
    """10 W/m2 into the base of dry peat for ten years: out of range, told, no numbers."""
    peat = inert(0.02, 1e5, "dry")
    with pytest.raises(SolverError, match="beyond 200 degC"):
        solve(uniform(peat, 3.0), constant(0.0, 3650), initial=0.0, base_heat_flux=10.0, output_every="10D")


def test_fault_in_a_later_window_is_dated():
    """Long marches are cut into windows; the time of a fault counts from the start of all."""
    count = WINDOW + 500
    surface = np.zeros(count + 1)
    surface[WINDOW + 101 :] = 900.0
    with pytest.raises(SolverError, match=rf"^solver, {(WINDOW + 100) / 24:.3f} days"):
        march_column(COLUMN, np.arange(count + 1) * HOUR, surface, 0.0)


def test_windows_leave_the_bits():
    """Three windows, or the same march begun anew from the end of each: equal to the last bit, heat to rounding."""
    count = 2 * WINDOW + 777
    seconds = np.arange(count + 1) * HOUR
    surface = 1.0 + 9.0 * np.cos(2 * np.pi * seconds / (60 * DAY))
    outputs = np.arange(0.0, seconds[-1], 30 * DAY)
    shares: list[float] = []
    schedule = make_schedule(seconds, surface, outputs, max_step=HOUR)
    whole = march(
        COLUMN.table, schedule, np.ones(31), base_flux=0.02, watch=1, tolerance=np.inf, progress=shares.append
    )
    assert shares == [WINDOW / count, 2 * WINDOW / count, 1.0]
    assert np.isfinite(whole.temperature).all()
    assert whole.temperature.shape == (outputs.size, 31)
    stored = COLUMN.heat_content(whole.temperature)
    entered = whole.heat - whole.heat_out
    np.testing.assert_allclose(stored - stored[0], entered, rtol=0, atol=1e-9 * np.abs(np.diff(whole.heat)).sum())
    assert whole.heat_out[-1] == pytest.approx(-0.02 * outputs[-1], rel=1e-9)


def test_compiled_or_not_the_bits_are_the_same():
    """The kernels as plain Python: the same numbers, so coverage and tracebacks of one speak for the other."""
    plain = subprocess.run(
        [sys.executable, "-m", "tests.helpers.digest"], cwd=ROOT, capture_output=True, text=True, check=True,
        timeout=120,         env={**os.environ, "NUMBA_DISABLE_JIT": "1", "PYTHONPATH": str(ROOT)},
    )  # fmt: skip
    assert plain.stdout == digest()


@pytest.mark.parametrize("thickness", [0.001, 0.004, 0.02, 0.03, 0.06, 0.1])
@pytest.mark.parametrize("base", ["heat flux", "temperature"])
def test_very_thin_columns(thickness, base):
    """From a sheet of a millimetre up, steady: a straight line between the ends."""
    days = np.arange(0.0, 11.0)
    ends = {"base_temperature": points(days * DAY, np.full(11, 2.0))} if base == "temperature" else {}
    result = solve(uniform(inert(1.0, 2e6), thickness), points(days * DAY, np.full(11, 6.0)), initial=4.0, **ends)
    expected = 6.0 - (4.0 * result.depth / thickness if ends else 0.0 * result.depth)
    np.testing.assert_allclose(result.ground_temperature.isel(time=-1), expected, rtol=0, atol=1e-6)


def test_many_thin_layers():
    """200 layers of a millimetre, half of them board: it runs, and keeps the heat."""
    board, silt = inert(0.03, 4e4, "board"), SILT
    profile = Profile([Layer(board if n % 2 else silt, 0.001) for n in range(200)])
    result = solve(profile, constant(-5.0, 20), initial=5.0, numerical_error="left out")
    assert float(result.ground_temperature.isel(time=-1, depth=-1)) < 4.0


def test_no_place_for_compiled_code(monkeypatch):
    """Where neither the package nor the user's folder may be written to, numba refuses to cache: compile without."""
    asked = []

    def refusing(**options):
        asked.append(options)
        if options.get("cache"):
            raise RuntimeError("cannot cache function 'door': no locator available for file 'x.py'")
        return lambda function: function

    monkeypatch.setattr(stage, "njit", refusing)
    assert stage.door(parallel=True)(len) is len
    assert [options.get("cache", False) for options in asked] == [True, False]
    assert all(options["parallel"] for options in asked)
