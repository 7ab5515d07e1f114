"""The cautions that go with every result: on the screen, in files, on pages."""

from __future__ import annotations

__all__ = ["CAUTIONS", "CAUTION_SHORT", "CLIMATE_CAUTIONS"]

CAUTION_SHORT = (
    "An aid to judgement, not a design: local codes and the licensed engineer in charge decide the depth of cover."
)

CAUTION_WINTER = "A winter in the record is not the coldest that will come. State the winter the design is for."

CAUTIONS: tuple[str, ...] = (
    CAUTION_SHORT,
    (
        "One-dimensional conduction with latent heat: water that flows or rises in the soil, wind, uneven snow, "
        "buildings, trenches, walls and other pipes nearby are not in it and can bring frost deeper."
    ),
    (
        "Snow, vegetation and sun enter as n-factors or as a resistance that was stated; a surface cleared of snow "
        "freezes deeper than the same surface under snow, and the winter with the deepest frost may be a mild one "
        "without snow."
    ),
    (
        "Soil properties vary along a line and with the seasons; published conductivity models scatter by 25 % and "
        "more. Confirm layers, density and water content by borings and tests at the site."
    ),
    CAUTION_WINTER,
    (
        "A frozen main can burst and cut off water for fire fighting; frost heave and thaw settlement can break a gas "
        "or oil line. Where the margin is small, measure ground temperature at the site before relying on it."
    ),
)

CLIMATE_CAUTIONS: tuple[str, ...] = (
    CAUTION_SHORT,
    CAUTION_WINTER,
    (
        "A station is not the site: towns, slopes, valleys, water and height change the air, and snow and cover change "
        "what reaches the ground. The index of the air becomes that of the surface by an n-factor."
    ),
    ("Codes name the practice and the definition of the index to use; values by different ones must not be mixed."),
)
"""Those that go with the winters of a record."""
