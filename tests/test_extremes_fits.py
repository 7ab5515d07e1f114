"""Gumbel and GEV: published variates, SciPy's own distributions, both estimators, zeros, intervals that cover."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import optimize, stats

from soiltemp.climate import (
    fit_gev,
    fit_gumbel,
    goodness_of_fit,
    plotting_positions,
    probability_plot,
    return_value,
    return_values,
)
from soiltemp.climate.extremes import ExtremeFit
from soiltemp.climate.gev import fit_samples, l_moments, non_exceedance, quantile
from soiltemp.errors import InputError, UnitError
from tests.helpers.weather import DAY

SAMPLE = stats.genextreme.rvs(0.1, loc=280 * DAY, scale=90 * DAY, size=36, random_state=4)


@pytest.mark.parametrize(
    ("period", "variate"), [(2, 0.3665), (5, 1.4999), (10, 2.2504), (20, 2.9702), (50, 3.9019), (100, 4.6001)]
)
def test_reduced_variates_of_gumbel(period: int, variate: float) -> None:
    """y_n = -ln(-ln(1 - 1/n)), as tables of ISO 13793's F_n use it; four decimals as printed."""
    fit = ExtremeFit("gumbel", "l-moments", 0.0, 1.0, 0.0, (1.0,) * 36)
    assert return_value(fit, period) == pytest.approx(variate, abs=5e-5)


@pytest.mark.parametrize("shape", [-0.3, -1e-9, 0.0, 1e-6, 0.2, 0.9])
def test_distribution_is_scipys(shape: float) -> None:
    """Second implementation: scipy.stats.genextreme, whose c is Hosking's k."""
    own = stats.genextreme(shape, loc=5.0, scale=2.0)
    p = np.linspace(0.001, 0.999, 50)
    parameters = (np.array(5.0), np.array(2.0), np.array(shape))
    # below a shape of 1e-7 Gumbel's formula is taken, off by shape y^2 / 2 of a scale: 2e-8 at y = 7, shape 1e-9
    np.testing.assert_allclose(quantile(p, *parameters), own.ppf(p), rtol=2e-8)
    np.testing.assert_allclose(non_exceedance(own.ppf(p), *parameters), p, rtol=2e-8)


@pytest.mark.parametrize("shape", [-0.25, 0.0, 0.3])
def test_l_moments_give_back_the_distribution(shape: float) -> None:
    """A sample of the quantiles at the middle of a million equal steps has the L-moments of the distribution."""
    p = (np.arange(1_000_000) + 0.5) / 1_000_000
    sample = stats.genextreme(shape, loc=300.0, scale=80.0).ppf(p)
    location, scale, found = (float(part[0]) for part in fit_samples(sample[None], "gev", "l-moments"))
    # what lies beyond the last step is lost: of a heavy tail 1e-6^(1 + shape) of its scale, some 1e-4
    assert [location, scale] == pytest.approx([300.0, 80.0], rel=1e-3)
    assert found == pytest.approx(shape, abs=1e-3)


def test_l_moments_by_their_definition() -> None:
    """l2 = half the mean difference of two, l3 = a third of the mean of x_3 - 2 x_2 + x_1 over all triples."""
    from itertools import combinations

    sample = np.array([3.0, 1.0, 7.0, 12.0, 5.0, 30.0])
    pairs = [abs(a - b) for a, b in combinations(sample, 2)]
    triples = [sorted(three) for three in combinations(sample, 3)]
    expected = (sample.mean(), np.mean(pairs) / 2, np.mean([c - 2 * b + a for a, b, c in triples]) / 3)
    np.testing.assert_allclose(l_moments(sample), expected, rtol=1e-12)


def test_likelihood_is_scipys() -> None:
    """Our search against scipy.stats.genextreme.fit from the true parameters: the same likelihood, or better."""
    days = SAMPLE / DAY
    ours = fit_gev(SAMPLE, method="maximum likelihood")
    theirs = stats.genextreme.fit(days, 0.1, loc=280, scale=90)
    mine = (ours.shape, ours.location / DAY, ours.scale / DAY)
    assert stats.genextreme.nnlf(mine, days) <= stats.genextreme.nnlf(theirs, days) + 1e-6
    np.testing.assert_allclose(mine, theirs, rtol=0.01)
    gumbel = fit_gumbel(SAMPLE, method="maximum likelihood")
    np.testing.assert_allclose((gumbel.location / DAY, gumbel.scale / DAY), stats.gumbel_r.fit(days), rtol=1e-6)


@pytest.mark.parametrize("shape", [-0.4, -0.2, 0.0, 0.1, 0.2, 0.3, 0.4])
def test_no_search_of_scipy_gets_likelier(shape: float) -> None:
    """Records of 30 winters: from our answer and from the truth, SciPy's simplex finds nothing likelier."""
    for seed in range(3):
        days = stats.genextreme.rvs(shape, loc=300, scale=80, size=30, random_state=seed)
        ours = [float(part[0]) for part in fit_samples(days[None], "gev", "maximum likelihood")]
        least = stats.genextreme.nnlf((ours[2], ours[0], ours[1]), days)

        def unlikelihood(parameters, days=days):
            return stats.genextreme.nnlf(tuple(parameters), days) if abs(parameters[0]) < 1.0 else np.inf

        for start in ((ours[2], ours[0], ours[1]), (0.0, 300.0, 80.0)):
            assert least <= optimize.minimize(unlikelihood, start, method="Nelder-Mead").fun + 1e-6, seed
        gumbel = fit_samples(days[None], "gumbel", "maximum likelihood")
        np.testing.assert_allclose([gumbel[0][0], gumbel[1][0]], stats.gumbel_r.fit(days), rtol=1e-6)


def test_both_estimators_find_the_truth() -> None:
    """5000 winters: L-moments and likelihood within a few standard errors (about 1.5 % of the scale) of the truth."""
    many = stats.genextreme.rvs(0.15, loc=300 * DAY, scale=80 * DAY, size=5000, random_state=7)
    for method in ("l-moments", "maximum likelihood"):
        fit = fit_gev(many, method=method)
        assert fit.location / DAY == pytest.approx(300.0, abs=4.0)
        assert fit.scale / DAY == pytest.approx(80.0, abs=3.0)
        assert fit.shape == pytest.approx(0.15, abs=0.04)
        true = stats.genextreme(0.15, loc=300, scale=80).isf(1 / 100)
        assert return_value(fit, 100) / DAY == pytest.approx(true, rel=0.02)


@pytest.mark.parametrize(("fit", "shape"), [(fit_gumbel, 0.0), (fit_gev, 0.1)])
def test_intervals_cover_the_truth(fit, shape: float) -> None:
    """90 % parametric intervals of the 50-winter index from 40 winters, 200 records.

    Percentile intervals of such short records fall somewhat short of what they claim: 88.6 % (Gumbel) and 86.6 % (GEV)
    were measured over 1000 records. 200 trials have a standard deviation of 2.2 %: limits at three of them.
    """
    truth = stats.genextreme(shape, loc=300, scale=80).isf(1 / 50) * DAY
    covered = 0
    for seed in range(200):
        sample = stats.genextreme.rvs(shape, loc=300 * DAY, scale=80 * DAY, size=40, random_state=seed)
        found = return_values(fit(np.maximum(sample, 1.0)), 50, samples=300, seed=seed)
        covered += bool(found.return_value_low[0] < truth < found.return_value_high[0])
    assert 160 <= covered <= 191, covered


def test_bootstrap_is_told_by_its_seed_and_narrows_with_the_record() -> None:
    fit = fit_gumbel(SAMPLE)
    one, same, other = (return_values(fit, [10, 50], seed=seed) for seed in (1, 1, 2))
    assert one.identical(same)
    assert not one.identical(other)
    np.testing.assert_allclose(one.return_value_low, other.return_value_low, rtol=0.05)
    many = return_values(fit_gumbel(np.tile(SAMPLE, 4)), 50)
    width, narrow = (float(x.return_value_high[-1] - x.return_value_low[-1]) for x in (one, many))
    assert narrow == pytest.approx(width / 2, rel=0.15)  # four times the winters: half the spread
    resampled = return_values(fit, [50], bootstrap="resampling")
    assert (resampled.return_value_high - resampled.return_value_low).item() == pytest.approx(width, rel=0.5)
    assert one.return_value.attrs["units"] == "K s"


def test_winters_without_frost_are_a_share_of_their_own() -> None:
    """Half of 60 winters without frost: once in n of all winters is once in n/2 of those with frost."""
    frosty = np.maximum(stats.gumbel_r.rvs(300 * DAY, 60 * DAY, size=30, random_state=3), DAY)
    alone, mixed = fit_gumbel(frosty), fit_gumbel(np.concatenate([frosty, np.zeros(30)]))
    assert (mixed.location, mixed.scale) == (alone.location, alone.scale)
    assert mixed.frost_free_share == 0.5
    assert return_value(mixed, 100) == pytest.approx(return_value(alone, 50), rel=1e-12)
    assert return_value(mixed, 1.9) == 0.0
    found = return_values(mixed, [1.5, 20.0, 100.0])
    assert float(found.return_value[0]) == 0.0
    assert (found.return_value_low[1:] < found.return_value[1:]).all()
    assert (found.return_value_high[1:] > found.return_value[1:]).all()


def test_anderson_darling_against_scipy_and_a_wrong_distribution() -> None:
    """The statistic is that of scipy.stats.anderson with the same parameters; samples of two humps are refused."""
    fit = fit_gumbel(SAMPLE, method="maximum likelihood")
    own = goodness_of_fit(fit, samples=60)
    theirs = stats.goodness_of_fit(
        stats.gumbel_r, SAMPLE / DAY, statistic="ad", n_mc_samples=9,
        known_params={"loc": fit.location / DAY, "scale": fit.scale / DAY},
    )  # fmt: skip
    assert own.statistic == pytest.approx(float(theirs.statistic), rel=1e-6)
    assert own.p_value > 0.05
    humps = np.concatenate([np.linspace(100, 120, 18), np.linspace(600, 620, 18)]) * DAY
    assert goodness_of_fit(fit_gumbel(humps)).p_value < 0.01
    # of true Gumbel samples the p-value is uniform: its mean is 1/2 with a standard deviation of 0.29 / sqrt(60)
    values = [
        goodness_of_fit(fit_gumbel(stats.gumbel_r.rvs(300, 60, size=40, random_state=n) * DAY), samples=200).p_value
        for n in range(60)
    ]
    assert np.mean(values) == pytest.approx(0.5, abs=0.12)


@pytest.mark.parametrize(
    ("name", "largest"), [("weibull", 37 / 1), ("gringorten", 36.12 / 0.56), ("cunnane", 36.2 / 0.6)]
)
def test_plotting_positions(name: str, largest: float) -> None:
    """Return period of the largest of 36: (n + 1 - 2 a) / (1 - a), the textbook form."""
    points = probability_plot(SAMPLE, positions=name)
    assert float(points.return_period[-1]) == pytest.approx(largest, rel=1e-12)
    np.testing.assert_array_equal(points.value, np.sort(SAMPLE))
    np.testing.assert_allclose(np.exp(-np.exp(-points.reduced_variate)), points.non_exceedance_probability)
    assert plotting_positions()[name].source in points.attrs["source"]


@pytest.mark.parametrize(
    ("call", "match"),
    [
        (
            lambda: fit_gumbel(SAMPLE[:9]),
            "^winters, gumbel distribution: found 9 winters with frost, of 9; allowed: at",
        ),
        (lambda: fit_gev(SAMPLE[:19]), r"19 winters with frost.*or Gumbel's distribution\.$"),
        (lambda: fit_gumbel([*SAMPLE, np.nan]), "^winters: found nan as number 37 of 37"),
        (lambda: fit_gumbel([*SAMPLE, -1.0]), "^winters: found -1 as number 37"),
        (lambda: fit_gumbel([5.0] * 40), "^winters: found the same value"),
        (lambda: fit_gumbel(np.concatenate([SAMPLE[:8], np.zeros(30)])), "found 8 winters with frost, of 38"),
        (lambda: fit_gumbel(SAMPLE.reshape(6, 6)), "^winters: found an array of shape"),
        (lambda: fit_gumbel("cold"), '^winters: found "cold"; allowed: numbers'),
        (lambda: fit_gumbel(SAMPLE, method="moments"), '^method: found str "moments"'),
        (lambda: return_value(fit_gumbel(SAMPLE), 1.0), "^return_period: found float"),
        (lambda: return_value(fit_gumbel(SAMPLE), float("nan")), "^return_period: found float"),
        (lambda: return_value(fit_gumbel(SAMPLE), "50"), "^return_period: found str"),
        (lambda: return_value(fit_gumbel(SAMPLE), 1000), "found 1000 winters from a record of 36; allowed: up to 10 t"),
        (lambda: return_values(fit_gumbel(SAMPLE), 50, confidence=90), "^confidence: found int"),
        (lambda: return_values(fit_gumbel(SAMPLE), 50, samples=5), "^samples: found int"),
        (lambda: return_values(fit_gumbel(SAMPLE), 50, seed=-1), "^seed: found int"),
        (lambda: return_values(fit_gumbel(SAMPLE), 50, bootstrap="jackknife"), "^bootstrap: found str"),
        (lambda: probability_plot(SAMPLE, positions="hazen"), '^positions: found str "hazen"'),
    ],
)
def test_bad_input(call, match) -> None:
    with pytest.raises(InputError, match=match):
        call()


def test_wrong_unit() -> None:
    import xarray as xr

    with pytest.raises(UnitError, match=r"^winters, units: found "):
        fit_gumbel(xr.DataArray(SAMPLE, dims="winter", attrs={"units": "m"}))
