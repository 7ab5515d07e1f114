"""A site run from its file to a result that can be read, saved and run again."""

from soiltemp.site_run.comparison import compare_snow
from soiltemp.site_run.forcing import forcing_of
from soiltemp.site_run.inputs import site_from_result
from soiltemp.site_run.running import run
from soiltemp.site_run.weather import Weather, read_weather

__all__ = ["Weather", "compare_snow", "forcing_of", "read_weather", "run", "site_from_result"]
