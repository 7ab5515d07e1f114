"""The cautions that go with every result: on the screen, in files, on pages."""

from __future__ import annotations

__all__ = ["CAUTIONS", "CAUTION_SHORT"]

CAUTION_SHORT = (
    "An aid to judgement, not a design: local codes and the licensed engineer in charge decide the depth of cover."
)

CAUTIONS: tuple[str, ...] = (
    CAUTION_SHORT,
    (
        "One-dimensional conduction with latent heat: water that flows or rises in the soil, wind, uneven snow, "
        "buildings, trenches, walls and other pipes nearby are not in it and can bring frost deeper."
    ),
    (
        "Snow, vegetation and sun enter as n-factors; a surface cleared of snow freezes deeper than the same surface "
        "under snow."
    ),
    (
        "Soil properties vary along a line and with the seasons; published conductivity models scatter by 25 % and "
        "more. Confirm layers, density and water content by borings and tests at the site."
    ),
    "A winter in the record is not the coldest that will come. State the winter the design is for.",
    (
        "A frozen main can burst and cut off water for fire fighting; frost heave and thaw settlement can break a gas "
        "or oil line. Where the margin is small, measure ground temperature at the site before relying on it."
    ),
)
