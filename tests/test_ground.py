"""Layers and profiles: depths, copies, refusals."""

from __future__ import annotations

from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from soiltemp.errors import InputError, SoilTempError, UnitError
from soiltemp.ground import Layer, Profile
from soiltemp.materials import Material, Soil, material

SILT = Soil(1500.0, 0.24, "fine", 0.3, name="silt")
ROCK = Material("rock", 3.5, 3.5, 2.0e6, 2.0e6, 0.0)
PROFILE = Profile([Layer(SILT, 1.5), Layer(material("sand, saturated"), "10 ft"), Layer(ROCK, 15.0)])


def test_layer_keeps_soil_material_and_name() -> None:
    layer = Layer(SILT, "4 ft")
    assert (layer.soil, layer.material, layer.name, layer.thickness) == (
        SILT,
        SILT.material(),
        "silt",
        1.2192,
    )
    assert Layer(ROCK, 1.0).soil is None
    assert Layer(ROCK, 1.0, name="bedrock").name == "bedrock"
    kersten = Layer(SILT, 1.0, conductivity_model="kersten_1949")
    assert kersten.material == SILT.material("kersten_1949")
    thicker = kersten.with_thickness("2 m")
    assert (thicker.thickness, thicker.material, thicker.soil) == (2.0, kersten.material, SILT)
    assert kersten.thickness == 1.0


def test_depths() -> None:
    assert PROFILE.interfaces == (0.0, 1.5, 4.548, 19.548)
    assert PROFILE.base == 19.548
    assert len(PROFILE) == 3
    assert [layer.name for layer in PROFILE] == ["silt", "sand, saturated", "rock"]


def test_depths_do_not_gather_rounding() -> None:
    assert Profile([Layer(ROCK, 0.1)] * 10).interfaces == tuple(round(0.1 * i, 1) for i in range(11))


@pytest.mark.parametrize(
    ("depth", "name"),
    [
        (0.0, "silt"),
        (1.4999, "silt"),
        (1.5, "sand, saturated"),
        ("4.548 m", "rock"),
        (19.548, "rock"),
        ("1 ft", "silt"),
    ],
)
def test_layer_at_a_depth(depth: Any, name: str) -> None:
    assert PROFILE.layer_at(depth).name == name


@settings(deadline=None, max_examples=60)
@given(st.lists(st.floats(1e-3, 1000.0), min_size=1, max_size=30), st.floats(0.0, 1.0))
def test_layer_at_any_depth_holds_that_depth(thicknesses: list[float], share: float) -> None:
    profile = Profile(Layer(ROCK, t) for t in thicknesses)
    depth = share * profile.base
    i = profile.index_at(depth)
    assert profile.interfaces[i] <= depth <= profile.interfaces[i + 1]
    assert profile.base == pytest.approx(sum(thicknesses), rel=1e-12, abs=1e-9)


def test_copies() -> None:
    top, board = Layer(ROCK, 1.0, name="top"), Layer(material("XPS board, wet"), "5 cm")
    assert [x.name for x in PROFILE.with_layer(1, top)] == ["silt", "top", "rock"]
    assert [x.name for x in PROFILE.without_layer(0)] == ["sand, saturated", "rock"]
    assert [x.name for x in PROFILE.with_inserted(0, top)] == ["top", "silt", "sand, saturated", "rock"]
    assert [x.name for x in PROFILE.with_inserted(3, top)][-1] == "top"
    inserted = PROFILE.with_inserted(1, board)
    assert inserted.interfaces == (0.0, 1.5, 1.55, 4.598, 19.598)
    assert inserted.without_layer(1) == PROFILE
    assert hash(inserted.without_layer(1)) == hash(PROFILE)


@pytest.mark.parametrize(
    ("arguments", "options", "error", "words"),
    [
        ((SILT, 0.0), {}, InputError, 'layer "silt", thickness: found 0 m; allowed: 0.001 to 1000 m'),
        ((SILT, -1.5), {}, InputError, 'layer "silt", thickness: found -1.5 m'),
        ((SILT, 1500.0), {}, InputError, "0.001 to 1000 m"),
        ((SILT, float("nan")), {}, InputError, "finite"),
        ((SILT, "1.5"), {}, UnitError, "without a unit"),
        ((SILT, "1.5 K"), {}, UnitError, "a length"),
        ((SILT, None), {}, InputError, "nothing"),
        (("sand, saturated", 1.0), {}, InputError, "soiltemp.material(name)"),
        ((1.5, SILT), {}, InputError, "layer, material: found float '1.5'; allowed: a Material or a Soil"),
        ((ROCK, 1.0), {"conductivity_model": "kersten_1949"}, InputError, "for a material, which has its"),
        (
            (SILT, 1.0),
            {"conductivity_model": "best"},
            InputError,
            'soil "silt", conductivity model: found "best"',
        ),
        ((SILT, 1.0), {"name": ""}, InputError, "layer, name: found ''"),
    ],
)
def test_layers_refused(
    arguments: tuple[Any, ...], options: dict[str, Any], error: type[SoilTempError], words: str
) -> None:
    with pytest.raises(error) as caught:
        Layer(*arguments, **options)
    assert words in str(caught.value)


@pytest.mark.parametrize(
    ("layers", "words"),
    [
        ([], "profile, layers: found none; allowed: 1 to 200 layers"),
        (
            Layer(ROCK, 1.0),
            "profile, layers: found Layer; allowed: a list of layers; write Profile([layer, ...])",
        ),
        (None, "profile, layers: found NoneType"),
        ([Layer(ROCK, 1.0), ROCK], 'layer 2 "rock": found Material'),
        ([Layer(ROCK, 1.0), (ROCK, 2.0)], "layer 2: found tuple"),
        ([Layer(ROCK, 1.0)] * 201, 'layer 201 "rock": found more than 200 layers; allowed: 1 to 200'),
    ],
)
def test_profiles_refused(layers: Any, words: str) -> None:
    with pytest.raises(InputError) as caught:
        Profile(layers)
    assert str(caught.value).startswith(words)
    assert words in str(caught.value)


def test_200_layers_are_allowed() -> None:
    assert len(Profile([Layer(ROCK, 1.0)] * 200)) == 200


@pytest.mark.parametrize("depth", [-0.1, 19.6, float("nan"), "30 m"])
def test_depths_outside_are_refused(depth: Any) -> None:
    with pytest.raises(InputError, match=r"^depth in the profile: found "):
        PROFILE.layer_at(depth)


@pytest.mark.parametrize("index", [-1, 3, 1.0, True, None, "1"])
def test_indices_outside_are_refused(index: Any) -> None:
    words = r"^layer index: found .*; allowed: 0 to 2; count the layers from 0"
    with pytest.raises(InputError, match=words):
        PROFILE.without_layer(index)
    with pytest.raises(InputError, match=words):
        PROFILE.with_layer(index, Layer(ROCK, 1.0))


def test_the_last_layer_stays() -> None:
    with pytest.raises(InputError, match=r"found none; allowed: 1 to 200 layers"):
        Profile([Layer(ROCK, 1.0)]).without_layer(0)
