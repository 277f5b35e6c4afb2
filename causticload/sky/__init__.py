"""What shines: sun positions, the sun's disc, beam irradiance and the days of a year."""

from causticload.sky.beam import clear_beam
from causticload.sky.calendar import format_local, parse_local
from causticload.sky.disc import SunDisc
from causticload.sky.plan import DayPlan, plan_year
from causticload.sky.position import (
    SunAngles,
    SunPosition,
    solar_position,
    sun_angles,
    sun_direction,
    sun_position,
)
from causticload.sky.source import Sky, SunStates
from causticload.sky.weather import Weather, read_weather

__all__ = [
    "DayPlan",
    "Sky",
    "SunAngles",
    "SunDisc",
    "SunPosition",
    "SunStates",
    "Weather",
    "clear_beam",
    "format_local",
    "parse_local",
    "plan_year",
    "read_weather",
    "solar_position",
    "sun_angles",
    "sun_direction",
    "sun_position",
]
