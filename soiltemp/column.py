"""A column: the grid of a profile and the straight pieces that the solver reads.

Nodes stand on the ground surface and on every layer interface; between two nodes there is one material. A node stores
half of each neighbouring element's heat; an element conducts the difference of its material's conduction potential over
its thickness, which is exact in steady state for any conductivity.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from soiltemp.errors import InputError, message
from soiltemp.ground import Profile
from soiltemp.materials.curves import Curves

__all__ = ["Column", "build_column", "graded_grid"]

Floats = NDArray[np.float64]

SMALLEST_ELEMENT = 0.01
"""Thickness of the element under the surface [m]: a daily wave (damping depth 5 to 15 cm) is resolved from 1 cm."""

FINE_ELEMENT = 0.025
"""Largest element down to the depth that frost may reach [m]: an element is what the 0 degC line is uncertain by."""

GROWTH = 1.04
"""Largest ratio of neighbouring elements, and of an element below the frost zone to its neighbour above."""

COARSEST_ELEMENT = 0.5
"""Largest element anywhere [m]: an annual wave (damping depth 1 to 4 m) is resolved by it."""

LEAST_ELEMENTS = 8
"""Fewest elements of a column, so that half of them still are one."""

SAME_KNOT = 1e-9
"""Knots of two materials closer than this [K] are one knot of the node between them."""


def graded_grid(
    thicknesses: tuple[float, ...], frost_zone: float, *, fineness: float = 1.0
) -> tuple[Floats, NDArray[np.int64]]:
    """Node depths of a column and the layer of every element.

    Every layer gets an even number of elements whose sizes follow one smooth target, so that the grid with every
    second node left out is a grid of the same kind and twice as coarse.

    Parameters
    ----------
    thicknesses : tuple of float
        Layer thicknesses, top down [m].
    frost_zone : float
        Depth down to which elements stay at most `FINE_ELEMENT` [m].
    fineness : float
        Divides every target size; 2 makes the grid twice as fine.

    Returns
    -------
    depths : float64 (node,)
        Node depths [m], 0 first, the base of the profile last.
    layer : int64 (element,)
        Index of the layer that each element lies in.

    Examples
    --------
    >>> depths, layer = graded_grid((0.5, 1.5), 1.0)
    >>> float(depths[-1]), bool(0.5 in depths), layer.size % 2
    (2.0, True, 0)
    """
    # The target size is integrated on a fine ladder of depths: number of elements above depth z.
    base = float(np.sum(thicknesses))
    ladder = np.unique(
        np.concatenate([np.linspace(0.0, min(base, frost_zone + 8.0), 2000), np.linspace(0.0, base, 2000)])
    )
    target = np.minimum(SMALLEST_ELEMENT + (GROWTH - 1.0) * ladder, FINE_ELEMENT)
    target = np.maximum(target, FINE_ELEMENT + (GROWTH - 1.0) * (ladder - frost_zone))
    target = np.minimum(target, COARSEST_ELEMENT)
    density = fineness / target
    above = np.concatenate([[0.0], np.cumsum(np.diff(ladder) * 0.5 * (density[1:] + density[:-1]))])
    least = -(-LEAST_ELEMENTS // (2 * len(thicknesses)))
    pieces: list[Floats] = [np.zeros(1)]
    layer: list[int] = []
    top = 0.0
    for index, thickness in enumerate(thicknesses):
        bounds = np.interp([top, top + thickness], ladder, above)
        elements = 2 * max(least, int(np.ceil(0.5 * (bounds[1] - bounds[0]) - 1e-9)))
        inner = np.interp(np.linspace(bounds[0], bounds[1], elements + 1), above, ladder)
        inner[0], inner[-1] = top, top + thickness
        pieces.append(inner[1:])
        layer.extend([index] * elements)
        top += thickness
    return np.concatenate(pieces), np.array(layer, dtype=np.int64)


@dataclass(frozen=True, eq=False)
class Column:
    """A profile on its grid.

    Attributes
    ----------
    profile : Profile
        The ground.
    depths : float64 (node,)
        Node depths [m].
    layer : int64 (element,)
        Layer of each element.
    """

    profile: Profile
    depths: Floats
    layer: NDArray[np.int64]

    @cached_property
    def thickness(self) -> Floats:
        """Element thickness [m], (element,)."""
        return np.asarray(np.diff(self.depths))

    @cached_property
    def curves(self) -> tuple[Curves, ...]:
        """The two curves of each layer's material."""
        return tuple(layer.material.curves() for layer in self.profile.layers)

    @cached_property
    def table(self) -> Floats:
        """Straight pieces of every node, float64 (node, segment, 8): what the kernel reads."""
        return _pieces(self.thickness, self.layer, self.curves)

    def coarsened(self) -> Column:
        """The same column on every second node."""
        return Column(self.profile, self.depths[::2].copy(), self.layer[::2].copy())

    def heat_content(self, temperature: Floats) -> Floats:
        """Heat stored above 0 degC, latent heat included [J m-2], summed over the last axis (node)."""
        total = np.zeros(temperature.shape[:-1])
        for curves, nodes, volume in self._layers():
            total += curves.enthalpy(temperature[..., nodes]) @ volume
        return total

    def _layers(self) -> Iterator[tuple[Curves, slice, Floats]]:
        """Curves of each layer, its nodes, and the part of each node's volume that lies in it [m]."""
        for index, curves in enumerate(self.curves):
            elements = np.flatnonzero(self.layer == index)
            half = 0.5 * self.thickness[elements]
            nodes = slice(int(elements[0]), int(elements[-1]) + 2)
            yield curves, nodes, np.append(half, 0.0) + np.append(0.0, half)

    def frozen_share(self, temperature: Floats) -> Floats:
        """Share of each node's volume that is frozen, 0 to 1, shape of `temperature`.

        A material without water counts as frozen below 0 degC.
        """
        share = np.zeros(temperature.shape)
        whole = np.zeros(self.depths.size)
        for curves, nodes, volume in self._layers():
            local = temperature[..., nodes]
            frozen = curves.frozen(local) if curves.knots else (local < 0.0).astype(np.float64)
            share[..., nodes] += frozen * volume
            whole[nodes] += volume
        return np.asarray(np.clip(share / whole, 0.0, 1.0))

    def at(self, temperature: Floats, depths: Floats) -> Floats:
        """Temperature at `depths` by straight lines between nodes; the last axis (node) becomes depth."""
        right = np.clip(np.searchsorted(self.depths, depths), 1, self.depths.size - 1)
        share = (depths - self.depths[right - 1]) / self.thickness[right - 1]
        # at a node the other neighbour has weight exactly 0 and cannot disturb the last bit
        return np.asarray(temperature[..., right - 1] * (1.0 - share) + temperature[..., right] * share)


def build_column(profile: Profile, *, frost_zone: float, fineness: float = 1.0) -> Column:
    """Put a profile on a graded grid, see `graded_grid`.

    Raises
    ------
    InputError
        If the column would need more than 5000 elements.
    """
    depths, layer = graded_grid(tuple(part.thickness for part in profile.layers), frost_zone, fineness=fineness)
    if layer.size > 5000:
        raise InputError(
            message(
                "column",
                f"{layer.size} elements",
                "at most 5000",
                "merge thin layers, or end the profile at a lesser depth",
            )
        )
    return Column(profile, depths, layer)


def _line(knots: Floats, slopes: Floats) -> Floats:
    """Intercepts of the straight pieces of a continuous curve that is 0 at 0 degC."""
    jumps = np.concatenate([[0.0], np.cumsum((slopes[:-1] - slopes[1:]) * knots)])
    return np.asarray(jumps - jumps[np.searchsorted(knots, 0.0)])


def _on_knots(curves: Curves, knots: Floats) -> tuple[Floats, Floats, Floats, Floats]:
    """Slopes and intercepts of both curves in the segments between `knots` (its own and another material's)."""
    inner = 0.5 * (knots[:-1] + knots[1:])
    probe = np.concatenate([knots[:1] - 1.0, inner, knots[-1:] + 1.0]) if knots.size else np.zeros(1)
    segment = np.searchsorted(np.asarray(curves.knots), probe)
    capacity = np.asarray(curves.heat_capacity, dtype=np.float64)[segment]
    conductivity = np.asarray(curves.conductivity, dtype=np.float64)[segment]
    return capacity, _line(knots, capacity), conductivity, _line(knots, conductivity)


def _merged(first: Curves, second: Curves) -> Floats:
    knots = np.unique(np.concatenate([np.asarray(first.knots, dtype=float), np.asarray(second.knots, dtype=float)]))
    if knots.size < 2:
        return knots
    return np.asarray(knots[np.concatenate([[True], np.diff(knots) > SAME_KNOT])])


def _pieces(thickness: Floats, layer: NDArray[np.int64], curves: tuple[Curves, ...]) -> Floats:
    """Fill the table of pieces: nodes inside a layer all at once, nodes between layers one by one."""
    nodes = thickness.size + 1
    above = np.concatenate([layer[:1], layer])  # material above each node; the surface has none and weighs it with 0
    below = np.concatenate([layer, layer[-1:]])
    h_above = np.concatenate([[np.inf], thickness])
    h_below = np.concatenate([thickness, [np.inf]])
    volume_above = np.concatenate([[0.0], 0.5 * thickness])
    volume_below = np.concatenate([0.5 * thickness, [0.0]])
    groups: dict[tuple[int, int], list[int]] = {}
    for node in range(nodes):
        groups.setdefault((int(above[node]), int(below[node])), []).append(node)
    knots_of = {pair: _merged(curves[pair[0]], curves[pair[1]]) for pair in groups}
    table = np.zeros((nodes, 1 + max(knots.size for knots in knots_of.values()), 8))
    for pair, members in groups.items():
        knots = knots_of[pair]
        span = slice(0, knots.size + 1)
        capacity_a, heat_a, conductivity_a, potential_a = _on_knots(curves[pair[0]], knots)
        capacity_b, heat_b, conductivity_b, potential_b = _on_knots(curves[pair[1]], knots)
        index = np.array(members)
        va, vb = volume_above[index, None], volume_below[index, None]
        ha, hb = h_above[index, None], h_below[index, None]
        columns = (
            va * heat_a + vb * heat_b,
            va * capacity_a + vb * capacity_b,
            potential_a / ha,
            conductivity_a / ha,
            potential_b / hb,
            conductivity_b / hb,
            np.broadcast_to(np.concatenate([[-np.inf], knots]), (index.size, knots.size + 1)),
            np.broadcast_to(np.concatenate([knots, [np.inf]]), (index.size, knots.size + 1)),
        )
        table[index, span, :] = np.stack(columns, axis=-1)
    return table
