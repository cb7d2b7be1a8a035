"""The sky: ephemeris, lunations, horizon and circumstances. Knows nothing of calendars or policies."""

from moonwrit.sky.circumstances import Circumstances, Evenings, Instant
from moonwrit.sky.ephemeris import Array, Ephemeris, Windows, ephemeris
from moonwrit.sky.horizon import STANDARD, Crossing, Horizon, Places
from moonwrit.sky.lunation import Lunations, lunations, span

__all__ = [
    "STANDARD", "Array", "Circumstances", "Crossing", "Ephemeris", "Evenings", "Horizon", "Instant", "Lunations",
    "Places", "Windows", "ephemeris", "lunations", "span",
]
