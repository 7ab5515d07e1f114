"""Snow by density: published forms, their known spread, and snow as a material."""

from __future__ import annotations

from typing import Any

import pytest

from soiltemp.errors import InputError
from soiltemp.materials import (
    conductivity_calonne_2011,
    conductivity_sturm_1997,
    conductivity_sturm_1997_log,
    conductivity_yen_1981,
    snow,
)

DENSITIES = (100.0, 200.0, 300.0, 400.0, 500.0)

# Coefficients from memory of each source; the numbers are a computed regression, worked out apart from this
# code.
REGRESSION: list[tuple[Any, tuple[float, ...]]] = [
    (conductivity_sturm_1997, (0.0464, 0.0653, 0.1260, 0.2513, 0.4413)),
    (conductivity_sturm_1997_log, (0.0410, 0.0755, 0.1390, 0.2559, 0.4710)),
    (conductivity_yen_1981, (0.0290, 0.1070, 0.2298, 0.3953, 0.6020)),
    (conductivity_calonne_2011, (0.0367, 0.0994, 0.2121, 0.3748, 0.5875)),
]


@pytest.mark.parametrize(("model", "expected"), REGRESSION)
def test_models_against_computed_regression(model: Any, expected: tuple[float, ...]) -> None:
    for density, k in zip(DENSITIES, expected, strict=True):
        assert model(density) == pytest.approx(k, abs=6e-5)  # four decimals


def test_models_against_a_pavement_guide() -> None:
    # WSDOT Pavement Guide, frost chapter (attribution from memory):
    # loose snow 0.06, compact 0.20 Btu/(h ft F) = 0.10 and 0.35 W/(m K);
    # Yen gives them at densities that are loose and compact indeed (195 and 373 kg/m3)
    assert conductivity_yen_1981(195.0) == pytest.approx(0.06 * 1.730735, rel=0.02)
    assert conductivity_yen_1981(373.0) == pytest.approx(0.20 * 1.730735, rel=0.02)


def test_yen_ends_near_ice() -> None:
    # ice at 0 degC: 2.2 W/(m K) (EN ISO 10456:2007, Table 3; value from memory); Yen's fit is 14 % short of
    # it
    assert conductivity_yen_1981(917.0) == pytest.approx(2.2, rel=0.15)


def test_quadratic_of_sturm_meets_its_line() -> None:
    # the two branches are joined by their authors to about 1 %
    assert conductivity_sturm_1997(155.999) == pytest.approx(conductivity_sturm_1997(156.0), rel=0.02)


def test_snow_as_a_material() -> None:
    layer = snow("300 kg/m^3", "yen_1981")
    assert layer.conductivity_frozen == layer.conductivity_thawed == conductivity_yen_1981(300.0)
    assert layer.heat_capacity_frozen == pytest.approx(300.0 * 2090.0)
    assert layer.latent_heat == 0.0
    assert layer.curves().knots == ()
    assert "Yen 1981" in layer.source
    assert snow(100.0, "calonne_2011", name="new snow").name == "new snow"


@pytest.mark.parametrize("model", [model for model, _ in REGRESSION])
@pytest.mark.parametrize(
    ("density", "words"),
    [(49.0, "found 49 kg/m^3; allowed: 50 to"), (0.3, "allowed: 50"), (1000.0, "kg/m^3; check")],
)
def test_density_out_of_range_is_refused(model: Any, density: float, words: str) -> None:
    with pytest.raises(InputError, match=r"^snow \(.*\), density: found") as caught:
        model(density)
    assert words in str(caught.value)


def test_snow_needs_a_named_model() -> None:
    with pytest.raises(InputError, match=r'conductivity model: found "sturm"; allowed: "calonne_2011", "sturm_1997"'):
        snow(300.0, "sturm")
    with pytest.raises(InputError, match=r"snow, density: found 950 kg/m\^3; allowed: 1 to 917"):
        snow(950.0, "yen_1981")
