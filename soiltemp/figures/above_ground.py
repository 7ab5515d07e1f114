"""What the picture of the frost shows above the ground: the surface temperature, and the snow in a strip below it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from soiltemp.figures.display import Display
from soiltemp.figures.drawing import nice_limits
from soiltemp.figures.reading import Floats

__all__ = ["SNOW", "AboveGround", "above_ground"]

SKY = 0.45
"""Height of the part where the surface temperature is drawn, as a share of the part below the ground."""

STRIP = 0.26
"""Height of the strip between ground and sky, where the snow is drawn, as a share of the part below the ground."""

LEAST_SNOW = 0.05
"""Least snow that the strip is made for [m]."""

TOPS = (0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.8, 1.0, 1.5, 2.0, 3.0, 4.0, 5.0, 6.0, 8.0, 10.0, 15.0, 20.0, 30.0, 40.0)
"""Heights of the strip [unit shown]: half of each is a number that can be read."""

SNOW = "#b9c4cc"


@dataclass(frozen=True)
class AboveGround:
    """Ends of the temperature and top of the snow (0 without snow) [units shown], and where their axes lie."""

    air: tuple[float, float]
    snow: float

    @property
    def height(self) -> float:
        """Height of all above the ground as a share of the part below."""
        return SKY + (STRIP if self.snow > 0.0 else 0.0)

    @property
    def ground(self) -> float:
        """Where the ground lies in the frame, from its foot [share]."""
        return 1.0 / (1.0 + self.height)

    @property
    def surface_range(self) -> tuple[float, float]:
        """Ends of the axis that put the temperatures into the sky, with a little room under it."""
        share = SKY * self.ground * 0.92
        return self.air[1] - (self.air[1] - self.air[0]) / share, self.air[1]

    @property
    def snow_range(self) -> tuple[float, float]:
        """Ends of the axis that let the snow begin at the ground, with a little room above it."""
        height = (self.snow or 1.0) / (STRIP * self.ground * 0.8)
        return -self.ground * height, (1.0 - self.ground) * height

    @property
    def bounds(self) -> tuple[float, float]:
        """Ends of what is drawn of the axis, in temperatures."""
        return self.beside(0.0) if self.snow > 0.0 else self.air[0], self.air[1]

    def beside(self, snow: float) -> float:
        """The temperature whose place on its axis is that of a snow depth."""
        (low, high), (first, last) = self.snow_range, self.surface_range
        return first + (snow - low) / (high - low) * (last - first)

    def labels(self, shown: Display) -> dict[float, str]:
        """Texts by their places on the axis of the temperature.

        The unit stands at each number: a title of the axis would run down into the ground. The strip of the snow has
        its numbers on the same axis: of two axes at one side, one would stand apart from the picture.
        """
        low, high = self.air
        step = next(s for s in (5.0, 10.0, 20.0, 50.0, 100.0) if (high - low) / s <= 5.0)
        ticks = [step * n for n in range(int(np.ceil(low / step)), int(np.floor(high / step)) + 1)]
        words = {tick: f"{tick:.0f} {shown.temperature_unit}".replace("-", "−") for tick in ticks}
        if self.snow > 0.0:
            words |= {self.beside(one): f"{one:.3g} {shown.depth_unit} snow" for one in (0.5 * self.snow, self.snow)}
        return words


def above_ground(temperatures: Floats, snow: Floats | None, shown: Display) -> AboveGround:
    """Ends of what is drawn above the ground.

    Parameters
    ----------
    temperatures : array (time)
        Of the surface [unit shown]; NaN where they are not drawn.
    snow : array (time) or None
        Snow depth [unit shown].
    shown : Display
        Units.

    Examples
    --------
    >>> from soiltemp.figures.display import display
    >>> above_ground(np.array([-12.0, 27.0]), np.array([0.0, 0.34]), display("si"))
    AboveGround(air=(-15.0, 30.0), snow=0.4)
    """
    air = (0.0, 1.0)
    if np.isfinite(temperatures).any():
        low, high = float(np.nanmin(temperatures)), float(np.nanmax(temperatures))
        air = nice_limits(min(low, shown.freezing), max(high, shown.freezing), 5.0 * shown.band)
    if snow is None:
        return AboveGround(air, 0.0)
    deepest = max(float(np.nanmax(snow, initial=0.0)), float(shown.depth(LEAST_SNOW)))
    return AboveGround(air, next((top for top in TOPS if top >= deepest), deepest))
