"""A material as two curves: rising, continuous, invertible, and with all its latent heat in them."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import quad

from soiltemp.errors import InputError
from soiltemp.materials import Curves, Material

SILT = Curves((-1.0, 0.0), (2.0e6, 82.0e6, 3.0e6), (2.5, 2.0, 1.5), (1.0, 0.0))
SALTY = Curves((-6.0, -2.0, -0.7, -0.2), (2e6, 6e6, 2e7, 1.5e8, 3e6), (2.4, 2.3, 2.1, 1.8, 1.4), (1.0, 0.9, 0.6, 0.0))


@st.composite
def curves(draw: st.DrawFn) -> Curves:
    """Columns of the sort the solver must stand: slope ratios to 1000, freezing ranges from 1e-4 K."""
    gaps = draw(st.lists(st.floats(1e-4, 5.0), min_size=0, max_size=5))
    top = draw(st.sampled_from([0.0, -0.1, -1.7, 4.0]))
    knots = tuple((top - np.cumsum([0.0, *gaps]))[::-1].tolist()) if gaps else ()
    segments = len(knots) + 1
    power = st.floats(-1.5, 1.5)
    capacity = tuple(2e6 * 10.0 ** draw(power) for _ in range(segments))
    conductivity = tuple(1.5 * 10.0 ** draw(power) for _ in range(segments))
    share = np.linspace(1.0, 0.0, len(knots)).tolist() if knots else []
    return Curves(knots, capacity, conductivity, tuple(share))


@settings(deadline=None, max_examples=200)
@given(curves(), st.lists(st.floats(-60.0, 60.0), min_size=2, max_size=30))
def test_curves_rise_pass_zero_and_are_continuous(material: Curves, temperatures: list[float]) -> None:
    t = np.unique(np.asarray([*temperatures, *material.knots]))
    for curve in (material.enthalpy, material.conduction_potential):
        value = curve(t)
        assert np.all(np.diff(value)[np.diff(t) > 1e-9] > 0.0)
        assert float(curve(0.0)) == 0.0
        for knot in material.knots:
            # one ulp of temperature on either side of a knot: a jump would show at once
            below, above = np.nextafter(knot, -99.0), np.nextafter(knot, 99.0)
            step = float(curve(above)) - float(curve(below))
            slope = max(material.heat_capacity if curve == material.enthalpy else material.conductivity)
            scale = np.max(np.abs(curve(np.asarray([-60.0, 60.0]))))
            assert step >= -1e-15 * scale
            assert step <= slope * (above - below) * 1.01 + 1e-14 * scale


@settings(deadline=None, max_examples=200)
@given(curves(), st.floats(-60.0, 60.0))
def test_temperature_comes_back_from_enthalpy(material: Curves, temperature: float) -> None:
    back = float(material.temperature_from_enthalpy(material.enthalpy(temperature)))
    # rounding of the enthalpy, seen through the smallest slope
    largest = float(np.max(np.abs(material.enthalpy(np.asarray([-60.0, 60.0])))))
    assert back == pytest.approx(temperature, abs=1e-13 + 1e-15 * largest / min(material.heat_capacity))


@settings(deadline=None, max_examples=100)
@given(curves(), st.floats(-30.0, 30.0))
def test_curves_are_integrals_of_their_slopes(material: Curves, temperature: float) -> None:
    def slope_at(values: tuple[float, ...], t: float) -> float:
        return values[sum(t > knot for knot in material.knots)]

    breaks = [k for k in material.knots if min(0.0, temperature) < k < max(0.0, temperature)]
    edges = [0.0, *sorted(breaks, reverse=temperature < 0.0), temperature]
    for curve, values in (
        (material.enthalpy, material.heat_capacity),
        (material.conduction_potential, material.conductivity),
    ):
        integral = sum((b - a) * slope_at(values, 0.5 * (a + b)) for a, b in pairwise(edges))
        scale = max(values) * 60.0
        assert float(curve(temperature)) == pytest.approx(integral, rel=1e-11, abs=1e-14 * scale)


def test_enthalpy_against_quadrature_of_a_general_library() -> None:
    for t in (-20.0, -6.0, -1.0, -0.2, 0.0, 12.0):
        expected, _ = quad(
            lambda x: SALTY.heat_capacity[sum(x > k for k in SALTY.knots)],
            0.0,
            t,
            points=SALTY.knots,
            limit=200,
        )
        assert float(SALTY.enthalpy(t)) == pytest.approx(expected, rel=1e-9)  # quad's own tolerance


def test_values_by_hand() -> None:
    assert SILT.enthalpy([-3.0, -1.0, -0.5, 0.0, 2.0]).tolist() == [-86e6, -82e6, -41e6, 0.0, 6e6]
    assert SILT.conduction_potential([-3.0, -1.0, -0.5, 0.0, 2.0]).tolist() == [-7.0, -2.0, -1.0, 0.0, 3.0]
    assert SILT.frozen([-3.0, -1.0, -0.25, 0.0, 2.0]).tolist() == [1.0, 1.0, 0.25, 0.0, 0.0]
    assert SILT.temperature_from_enthalpy([-86e6, -41e6, 6e6]).tolist() == [-3.0, -0.5, 2.0]
    assert SALTY.frozen(-1.35) == pytest.approx(0.75)


def test_shapes_are_kept_and_nan_stays() -> None:
    grid = np.linspace(-5.0, 5.0, 12).reshape(3, 4)
    for curve in (SILT.enthalpy, SILT.conduction_potential, SILT.frozen, SILT.temperature_from_enthalpy):
        assert curve(grid).shape == (3, 4)
        assert curve(0.3).shape == ()
        assert np.isnan(curve([np.nan, 1.0])).tolist() == [True, False]


def test_without_knots() -> None:
    rock = Curves((), (2e6,), (3.0,), ())
    assert rock.enthalpy([-2.0, 5.0]).tolist() == [-4e6, 10e6]
    assert rock.conduction_potential(-2.0) == -6.0
    assert rock.frozen([-30.0, 5.0]).tolist() == [0.0, 0.0]
    assert rock.temperature_from_enthalpy(10e6) == 5.0


@settings(deadline=None, max_examples=200)
@given(
    st.floats(0.0, 3.4e8),
    st.floats(-30.0, 0.0),
    st.floats(1e-4, 20.0),
    st.floats(1e6, 4e6),
    st.floats(1e6, 4e6),
)
def test_all_latent_heat_is_between_the_knots(
    latent: float, point: float, width: float, c_f: float, c_t: float
) -> None:
    material = Material("m", 1.0, 2.0, c_t, c_f, latent, point, width)
    curve = material.curves()
    ends = (point - width, point)
    rise = float(curve.enthalpy(ends[1]) - curve.enthalpy(ends[0]))
    sensible = 0.5 * (c_f + c_t) * (ends[1] - ends[0])
    # the difference of two enthalpies of the size of everything between 0 degC and -50 degC
    size = latent + 50.0 * max(c_f, c_t)
    assert rise - sensible == pytest.approx(latent, abs=1e-13 * size)
    potential = float(curve.conduction_potential(ends[1]) - curve.conduction_potential(ends[0]))
    assert potential == pytest.approx(1.5 * (ends[1] - ends[0]), rel=1e-9, abs=1e-13)
    assert curve.frozen(0.5 * (ends[0] + ends[1])) == pytest.approx(0.5, abs=1e-9)


def test_slopes_of_a_material() -> None:
    curve = Material("silt", 1.2, 2.0, 3.0e6, 2.0e6, 80e6, -0.1, 0.4).curves()
    assert curve.knots == (-0.5, -0.1)
    assert curve.conductivity == (2.0, 1.6, 1.2)
    assert curve.heat_capacity == pytest.approx((2.0e6, 2.5e6 + 200e6, 3.0e6), rel=1e-12)
    assert curve.frozen_share == (1.0, 0.0)


def test_no_knots_only_where_nothing_changes() -> None:
    assert Material("board", 0.04, 0.04, 4e4, 4e4, 0.0).curves() == Curves((), (4e4,), (0.04,), ())
    assert len(Material("a", 0.04, 0.05, 4e4, 4e4, 0.0).curves().knots) == 2
    assert len(Material("b", 0.04, 0.04, 4e4, 5e4, 0.0).curves().knots) == 2
    assert len(Material("c", 0.04, 0.04, 4e4, 4e4, 1e3).curves().knots) == 2


@pytest.mark.parametrize(
    ("arguments", "start", "words"),
    [
        (((0.0,), (1e6, 1e6), (1.0, 1.0), (1.0,)), "curves, knots: found 1 knot", "none, or 2"),
        (((-1.0, -1.0), (1e6,) * 3, (1.0,) * 3, (1.0, 0.0)), "curves, knot 1: found -1 degC after", "rising"),
        (
            ((0.0, -1.0), (1e6,) * 3, (1.0,) * 3, (1.0, 0.0)),
            "curves, knot 1: found -1 degC after 0",
            "rising",
        ),
        (
            ((-1.0, 0.0), (1e6,) * 2, (1.0,) * 3, (1.0, 0.0)),
            "curves, heat capacity: found 2 values",
            "3 values",
        ),
        (
            ((-1.0, 0.0), (1e6,) * 3, (1.0,) * 4, (1.0, 0.0)),
            "curves, conductivity: found 4 values",
            "3 values",
        ),
        (((-1.0, 0.0), (1e6,) * 3, (1.0,) * 3, ()), "curves, frozen share: found 0 values", "2 values"),
        (
            ((-1.0, 0.0), (1e6, 0.0, 1e6), (1.0,) * 3, (1.0, 0.0)),
            "curves, heat capacity 1: found 0",
            "above 0",
        ),
        (
            ((-1.0, 0.0), (1e6,) * 3, (1.0, 1.0, -1.0), (1.0, 0.0)),
            "curves, conductivity 2: found -1",
            "above 0",
        ),
        (
            ((-1.0, 0.0), (1e6,) * 3, (1.0,) * 3, (0.9, 0.0)),
            "curves, frozen share: found 0.9",
            "1 at the first",
        ),
        (
            ((-1.0, 0.0), (1e6,) * 3, (1.0,) * 3, (1.0, 0.1)),
            "curves, frozen share: found 1 at",
            "0 at the last",
        ),
        (
            ((-2.0, -1.5, -1.0, 0.0), (1e6,) * 5, (1.0,) * 5, (1.0, 0.2, 0.3, 0.0)),
            "curves, frozen share 2: found 0.3 after 0.2",
            "never rise",
        ),
        (((-1.0, float("nan")), (1e6,) * 3, (1.0,) * 3, (1.0, 0.0)), "curves, knots 1: found nan", "finite"),
        ((5.0, (1e6,), (1.0,), ()), "curves, knots: found 5.0", "sequence"),
    ],
)
def test_refused(arguments: tuple[tuple[float, ...], ...], start: str, words: str) -> None:
    with pytest.raises(InputError) as caught:
        Curves(*arguments)
    assert str(caught.value).startswith(start)
    assert words in str(caught.value)


def test_curves_are_values() -> None:
    assert hash(SILT) == hash(Curves([-1, 0], [2.0e6, 82.0e6, 3.0e6], [2.5, 2.0, 1.5], [1, 0]))  # type: ignore[arg-type]  # lists are taken too
