"""The site file: one TOML text that says where, under which climate, in which ground, and what to find out."""

from soiltemp.site.reading import parse_site, read_site
from soiltemp.site.study import WINTERS
from soiltemp.site.table import KEYS, LARGEST_FILE
from soiltemp.site.values import Line, Periodic, Record, Site, Study, Surface

__all__ = [
    "KEYS",
    "LARGEST_FILE",
    "WINTERS",
    "Line",
    "Periodic",
    "Record",
    "Site",
    "Study",
    "Surface",
    "parse_site",
    "read_site",
]
