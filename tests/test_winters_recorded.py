"""Recorded air: Champion's 36 winters by both definitions, and the typical year of Sand Point by days and by hours.

The numbers are recomputed here in a few plain lines; 1 % was asked for, and
the definitions leave less: they agree to the rounding of the printed number.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from soiltemp.climate import (
    daily_means,
    fit_gumbel,
    fit_periodic,
    freezing_index,
    freezing_indices,
    return_value,
    winters,
)
from tests.helpers.packaged import champion, needs_packaged_records, sand_point
from tests.helpers.weather import DAY

pytestmark = needs_packaged_records


@pytest.mark.parametrize("begins", ["07-01", None])
def test_champion_by_both_definitions(begins: str | None) -> None:
    """36 winters: 282 and at most 589 K day by the curve, 407 and at most 655 by the sum."""
    counted = winters(champion(), begins=begins)
    whole = counted.isel(winter=counted.air_complete.values == 1)
    assert whole.sizes["winter"] == 36
    assert counted.winter_label.values[[0, -1]].tolist() == ["1981-82", "2018-19"]
    curve, total = whole.air_freezing_index / DAY, whole.air_freezing_degree_days / DAY
    assert [float(curve.mean()), float(curve.max())] == pytest.approx([282.0, 589.4], abs=0.05)
    assert [float(total.mean()), float(total.max())] == pytest.approx([407.4, 655.5], abs=0.05)
    assert whole.winter_label.values[int(np.argmax(curve.values))] == "1983-84"


def test_champion_by_a_dumb_second_count() -> None:
    air = champion()
    counted = winters(air, begins="07-01")
    for place in range(1, 37):
        year = 1981 + place
        days = air.sel(time=slice(f"{year}-07-01", f"{year + 1}-06-30")).values
        highest = total = fall = below = 0.0
        for value in days.tolist():
            total += value
            below -= min(value, 0.0)
            highest = max(highest, total)
            fall = max(fall, highest - total)
        assert float(counted.air_freezing_index[place]) / DAY == pytest.approx(fall, rel=1e-9)
        assert float(counted.air_freezing_degree_days[place]) / DAY == pytest.approx(below, rel=1e-9)


def test_sand_point_by_days_and_by_hours() -> None:
    """228 K day of daily means, 244 of hours."""
    hours = sand_point()
    assert freezing_index(daily_means(hours)) / DAY == pytest.approx(227.9, abs=0.05)
    assert freezing_index(hours) / DAY == pytest.approx(244.3, abs=0.05)
    # as readings joined by straight lines instead of means of an hour: nearly the same
    assert freezing_index(hours.assign_attrs(cell_methods="time: point")) / DAY == pytest.approx(244.3, rel=0.01)


def test_champion_as_a_climate() -> None:
    """Residual weather lasts for days, and the errors know: independent days would claim half of them."""
    fit = fit_periodic(champion())
    assert 0.6 < fit.residual_autocorrelation < 0.8
    naive = fit.residual_deviation / np.sqrt(fit.values)
    assert 1.8 * naive < fit.mean_error < 4.0 * naive
    assert str(fit.annual[0].coldest)[5:7] == "01"


def test_champion_follows_gumbel_as_scipy_says() -> None:
    """Return value of L-moments against SciPy's likelihood: two estimators, one record; within the interval's half."""
    values, _ = freezing_indices(winters(champion()))
    likely = stats.gumbel_r(*stats.gumbel_r.fit(values.values / DAY)).isf(1 / 50)
    assert return_value(fit_gumbel(values), 50) / DAY == pytest.approx(likely, rel=0.06)
