"""The ground: layers from the surface down."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from math import fsum
from typing import Any

from soiltemp.errors import InputError, message
from soiltemp.materials.properties import Material, check_name
from soiltemp.materials.soil import Soil
from soiltemp.units import QuantityLike, to_si

__all__ = ["Layer", "Profile"]

_THICKNESS_LIMITS = (1e-3, 1000.0)
_MOST_LAYERS = 200
_NANOMETRE_DIGITS = 9


@dataclass(frozen=True, init=False)
class Layer:
    """One layer of the ground.

    Parameters
    ----------
    material_or_soil : Material or Soil
        What it is made of.
    thickness : float or str
        Thickness [m], 0.001 to 1000.
    conductivity_model : str, optional
        For a soil: which published model gives its conductivity (see
        :meth:`soiltemp.materials.Soil.material`).
    name : str, optional
        How the layer is called; left out, the name of its material.

    Attributes
    ----------
    material : Material
        The material.
    soil : Soil or None
        The soil that it was made from, if any.
    thickness : float
        Thickness [m].
    name : str
        Name for messages, tables and figures.

    Raises
    ------
    InputError, UnitError
        Something else than a material or soil, or a thickness out of range.

    Examples
    --------
    >>> layer = Layer(Soil(1500.0, 0.24, "fine", name="silt"), "4 ft")
    >>> layer.name, layer.thickness
    ('silt', 1.2192)
    """

    material: Material
    soil: Soil | None
    thickness: float
    name: str

    def __init__(
        self,
        material_or_soil: Material | Soil,
        thickness: QuantityLike,
        *,
        conductivity_model: str | None = None,
        name: str | None = None,
    ) -> None:
        where = "layer" if name is None else f'layer "{check_name(name, "layer")}"'
        if isinstance(material_or_soil, Soil):
            model = "johansen_1975" if conductivity_model is None else conductivity_model
            soil, material = material_or_soil, material_or_soil.material(model)
        elif isinstance(material_or_soil, Material):
            soil, material = None, material_or_soil
            if conductivity_model is not None:
                found = f'"{conductivity_model}" for a material, which has its conductivity'
                remedy = "leave the model out, or give a Soil"
                raise InputError(message(f"{where}, conductivity model", found, "none", remedy))
        else:
            found = f"{type(material_or_soil).__name__} {str(material_or_soil)[:40]!r}"
            remedy = "look a name up with soiltemp.material(name)"
            raise InputError(message(f"{where}, material", found, "a Material or a Soil", remedy))
        name = material.name if name is None else name.strip()
        low, high = _THICKNESS_LIMITS
        metres = to_si(thickness, "length", f'layer "{name}", thickness', low=low, high=high)
        for key, value in (("material", material), ("soil", soil), ("thickness", metres), ("name", name)):
            object.__setattr__(self, key, value)

    def with_thickness(self, thickness: QuantityLike) -> Layer:
        """Copy with another thickness.

        Parameters
        ----------
        thickness : float or str
            Thickness [m], 0.001 to 1000.

        Returns
        -------
        Layer
            The copy; its material is kept as it is.
        """
        copy = Layer(self.material, thickness, name=self.name)
        object.__setattr__(copy, "soil", self.soil)
        return copy


@dataclass(frozen=True, init=False)
class Profile:
    """Layers from the ground surface down; the base of the last is where the column ends.

    Parameters
    ----------
    layers : iterable of Layer
        Top down, 1 to 200.

    Attributes
    ----------
    layers : tuple of Layer
        The layers.

    Raises
    ------
    InputError
        No layer, too many, or something that is no layer; the message gives its number, counted from 1.

    Examples
    --------
    >>> silt = Material("silt", 1.2, 1.9, 2.6e6, 2.0e6, 1.2e8)
    >>> rock = Material("rock", 3.5, 3.5, 2.0e6, 2.0e6, 0.0)
    >>> profile = Profile([Layer(silt, 1.5), Layer(rock, "18.5 m")])
    >>> profile.interfaces, profile.layer_at(1.5).name
    ((0.0, 1.5, 20.0), 'rock')
    """

    layers: tuple[Layer, ...]

    def __init__(self, layers: Iterable[Layer]) -> None:
        object.__setattr__(self, "layers", _checked_layers(layers))

    def __len__(self) -> int:
        return len(self.layers)

    def __iter__(self) -> Iterator[Layer]:
        return iter(self.layers)

    @property
    def interfaces(self) -> tuple[float, ...]:
        """Depths of the layer boundaries from the surface (0) to the base [m], one more than the layers.

        Rounded to a nanometre, so that 0.1 m and 0.2 m end at 0.3 m.
        """
        thicknesses = [layer.thickness for layer in self.layers]
        return tuple(round(fsum(thicknesses[:i]), _NANOMETRE_DIGITS) for i in range(len(thicknesses) + 1))

    @property
    def base(self) -> float:
        """Depth of the base [m]."""
        return self.interfaces[-1]

    def index_at(self, depth: QuantityLike) -> int:
        """Index of the layer at a depth.

        Parameters
        ----------
        depth : float or str
            Depth below the surface [m], 0 to the base. A boundary belongs to the layer below it, the base to
            the last.

        Returns
        -------
        int
            Index in `layers`, from 0.

        Raises
        ------
        InputError, UnitError
            A depth outside the profile.
        """
        interfaces = self.interfaces
        at = to_si(depth, "length", "depth in the profile", low=0.0, high=interfaces[-1])
        return sum(1 for boundary in interfaces[1:-1] if boundary <= at)

    def layer_at(self, depth: QuantityLike) -> Layer:
        """Layer at a depth.

        Parameters
        ----------
        depth : float or str
            Depth below the surface [m], 0 to the base. A boundary belongs to the layer below it, the base to
            the last.

        Returns
        -------
        Layer
            The layer.

        Raises
        ------
        InputError, UnitError
            A depth outside the profile.
        """
        return self.layers[self.index_at(depth)]

    def with_layer(self, index: int, layer: Layer) -> Profile:
        """Copy with one layer replaced.

        Parameters
        ----------
        index : int
            Which one, from 0.
        layer : Layer
            The new layer.

        Returns
        -------
        Profile
            The copy.

        Raises
        ------
        InputError
            No such layer.
        """
        i = self._checked_index(index, len(self.layers) - 1)
        return Profile((*self.layers[:i], layer, *self.layers[i + 1 :]))

    def without_layer(self, index: int) -> Profile:
        """Copy without one layer; those below move up.

        Parameters
        ----------
        index : int
            Which one, from 0.

        Returns
        -------
        Profile
            The copy.

        Raises
        ------
        InputError
            No such layer, or the last one left.
        """
        i = self._checked_index(index, len(self.layers) - 1)
        return Profile((*self.layers[:i], *self.layers[i + 1 :]))

    def with_inserted(self, index: int, layer: Layer) -> Profile:
        """Copy with a layer put in; those below move down.

        Parameters
        ----------
        index : int
            Index that the new layer will have, from 0 to the number of layers.
        layer : Layer
            The new layer.

        Returns
        -------
        Profile
            The copy.

        Raises
        ------
        InputError
            No such place.
        """
        i = self._checked_index(index, len(self.layers))
        return Profile((*self.layers[:i], layer, *self.layers[i:]))

    def _checked_index(self, index: Any, greatest: int) -> int:
        if isinstance(index, bool) or not hasattr(index, "__index__") or not 0 <= index.__index__() <= greatest:
            remedy = "count the layers from 0 at the top"
            raise InputError(message("layer index", f"{index!r}"[:60], f"0 to {greatest}", remedy))
        return int(index.__index__())


def _checked_layers(layers: Any) -> tuple[Layer, ...]:
    if isinstance(layers, Layer) or not isinstance(layers, Iterable):
        found = f"{type(layers).__name__}"
        raise InputError(message("profile, layers", found, "a list of layers", "write Profile([layer, ...])"))
    found_layers: list[Layer] = []
    for number, layer in enumerate(layers, start=1):
        if not isinstance(layer, Layer):
            where = f'layer {number} "{getattr(layer, "name", "")}"' if hasattr(layer, "name") else f"layer {number}"
            found = f"{type(layer).__name__} {str(layer)[:40]!r}"
            raise InputError(message(where, found, "a Layer", "write Layer(material, thickness)"))
        if number > _MOST_LAYERS:
            remedy = "join thin layers of the same material"
            where = f'layer {number} "{layer.name}"'
            raise InputError(message(where, f"more than {_MOST_LAYERS} layers", f"1 to {_MOST_LAYERS}", remedy))
        found_layers.append(layer)
    if not found_layers:
        raise InputError(message("profile, layers", "none", f"1 to {_MOST_LAYERS} layers", "give at least one layer"))
    return tuple(found_layers)
