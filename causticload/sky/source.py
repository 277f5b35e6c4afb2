"""The sky of a study: sun, disc, beam and air at any time."""

from __future__ import annotations

from dataclasses import dataclass, field, fields
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from causticload.errors import InputError, StudyError
from causticload.sky.beam import clear_beam, table_turbidity
from causticload.sky.calendar import Times, utc_times
from causticload.sky.disc import SunDisc
from causticload.sky.position import SunPosition, angular_radius, check_place, solar_position
from causticload.sky.weather import CAP, Weather, read_weather
from causticload.study.model import Site, Study

__all__ = ["DEFAULT_TEMPERATURE_C", "DEFAULT_WIND_MS", "Sky", "SunStates"]

Floats = NDArray[np.float64]

DEFAULT_TEMPERATURE_C = 25.0  # a warm day, common practice
DEFAULT_WIND_MS = 1.0  # nearly still air, common practice


@dataclass(frozen=True, kw_only=True)
class SunStates:
    """Sun and air at times, all arrays (n,).

    Parameters
    ----------
    times : (n,) datetime64[us]
        UTC; NaT for positions of the sun that were given as such.
    azimuth_rad : (n,) float
        Clockwise from true north. [rad]
    elevation_rad : (n,) float
        Apparent elevation. [rad]
    radius_rad : (n,) float
        Angular radius of the sun. [rad]
    beam : (n,) float
        On a plane that faces the sun; zero when its centre is not above the horizon. [W/m²]
    diffuse : (n,) float
        From the sky, on the ground. [W/m²]
    temperature_c : (n,) float
        Air temperature. [°C]
    wind_ms : (n,) float
        Wind speed. [m/s]
    capped : (n,) bool
        Times in an hour of the weather file whose beam was cut to what a clear sky lets through.
    """

    times: Times
    azimuth_rad: Floats
    elevation_rad: Floats
    radius_rad: Floats
    beam: Floats
    diffuse: Floats
    temperature_c: Floats
    wind_ms: Floats
    capped: NDArray[np.bool_]

    def chosen(self, which: NDArray[np.bool_]) -> SunStates:
        """The same at some of the times only.

        Parameters
        ----------
        which : (n,) bool
            Times to keep.

        Returns
        -------
        states : SunStates
            Arrays of those.
        """
        return SunStates(**{f.name: getattr(self, f.name)[which] for f in fields(self)})


@dataclass(frozen=True, kw_only=True)
class Sky:
    """What shines on a site.

    Parameters
    ----------
    site : causticload.study.model.Site
        Where the model stands.
    disc : SunDisc
        How the sun's light is spread over its disc.
    turbidity : float, optional
        Linke turbidity of the clear sky. None takes the monthly table. [1]
    weather : Weather, optional
        Typical year. None is a clear sky all year.
    assumed : tuple of str
        Sentences on what was assumed, for the user.
    """

    site: Site
    disc: SunDisc = field(default_factory=SunDisc)
    turbidity: float | None = None
    weather: Weather | None = None
    assumed: tuple[str, ...] = ()

    @classmethod
    def from_study(cls, study: Study) -> Sky:
        """Sky that a study asks for.

        Parameters
        ----------
        study : causticload.study.model.Study
            The study.

        Returns
        -------
        sky : Sky
            Its sky; a weather file has been read.

        Raises
        ------
        StudyError
            If a weather file is asked for and not named.
        WeatherError
            If the weather file cannot be used.
        InputError
            If the site is not on Earth.
        """
        site, spec = study.site, study.sky
        check_place(
            latitude_deg=site.latitude, longitude_deg=site.longitude, elevation_m=site.elevation
        )
        weather = None
        assumed: list[str] = []
        if spec.source == "weather":
            if spec.file is None:
                raise StudyError(
                    'sky.source is "weather", but sky.file is missing',
                    where="sky",
                    hint="Name an EPW or TMY3 file.",
                )
            weather = read_weather(spec.file)
            assumed += weather.station_warnings(
                latitude_deg=site.latitude,
                longitude_deg=site.longitude,
                elevation_m=site.elevation,
            )
            assumed += weather.notes
            assumed.append(
                f"The hourly beam of {spec.file.name} is spread within each hour in the shape of "
                f"a clear sky's and never exceeds {CAP:g} times the beam of a very clear sky. "
                "A typical year has no 29 February; 28 February stands for it."
            )
        else:
            if spec.turbidity is None:
                assumed.append(_turbidity_sentence(site))
            assumed.append(
                f"Without a weather file the air is taken at {DEFAULT_TEMPERATURE_C:g} °C with a "
                f"wind of {DEFAULT_WIND_MS:g} m/s (common practice)."
            )
        return cls(
            site=site,
            disc=SunDisc(spec.disc),
            turbidity=spec.turbidity,
            weather=weather,
            assumed=tuple(assumed),
        )

    @property
    def _place(self) -> dict[str, float]:
        return {
            "latitude_deg": self.site.latitude,
            "longitude_deg": self.site.longitude,
            "elevation_m": self.site.elevation,
        }

    def at(self, times: Any) -> SunStates:
        """Sun and air at times.

        Parameters
        ----------
        times : (n,) datetime64 or pandas DatetimeIndex
            UTC, or with a zone; see :func:`causticload.sky.calendar.utc_times`.

        Returns
        -------
        states : SunStates
            Arrays (n,).
        """
        utc = utc_times(times)
        position = solar_position(utc, **self._place)
        capped = np.zeros(len(utc), dtype=bool)
        if self.weather is None:
            beam, diffuse, _ = clear_beam(position, utc, turbidity=self.turbidity, **self._place)
            temperature = np.full(len(utc), DEFAULT_TEMPERATURE_C)
            wind = np.full(len(utc), DEFAULT_WIND_MS)
        else:
            from_file = self.weather.beam_at(utc, position, **self._place)
            beam, diffuse, capped = from_file.beam, from_file.diffuse, from_file.capped
            temperature, wind = self.weather.air_at(utc)
        return SunStates(
            times=utc,
            azimuth_rad=position.azimuth_rad,
            elevation_rad=position.elevation_rad,
            radius_rad=position.radius_rad,
            beam=beam,
            diffuse=diffuse,
            temperature_c=temperature,
            wind_ms=wind,
            capped=capped,
        )

    def at_angles(
        self, azimuth_rad: ArrayLike, elevation_rad: ArrayLike, *, beam: float | None = None
    ) -> SunStates:
        """Sun at given angles, on no particular date.

        The sun is at its mean distance of 1 AU. The sky is clear, with the turbidity of the study
        or else the mean over the year of the monthly table; a weather file cannot be asked, as
        there is no hour.

        Parameters
        ----------
        azimuth_rad : (n,) float
            Clockwise from true north. [rad]
        elevation_rad : (n,) float
            Apparent elevation, in [-pi/2, pi/2]. [rad]
        beam : float, optional
            Beam irradiance, >= 0. None takes the clear sky's. [W/m²]

        Returns
        -------
        states : SunStates
            Arrays (n,); the times are NaT.

        Raises
        ------
        InputError
            If an argument is out of its range.
        """
        azimuth, elevation = np.broadcast_arrays(
            np.atleast_1d(np.asarray(azimuth_rad, dtype=float)),
            np.atleast_1d(np.asarray(elevation_rad, dtype=float)),
        )
        if not (np.isfinite(azimuth).all() and np.all(np.abs(elevation) <= np.pi / 2.0)):
            raise InputError("azimuth must be finite and elevation from -90 to 90 degrees")
        if beam is not None and not 0.0 <= beam < np.inf:
            raise InputError(f"beam must be >= 0 W/m², got {beam!r}")
        n = len(azimuth)
        distance = np.ones(n)
        position = SunPosition(
            azimuth_rad=azimuth % (2.0 * np.pi),
            elevation_rad=elevation,
            distance_au=distance,
            radius_rad=angular_radius(distance),
        )
        turbidity = self.turbidity
        if turbidity is None:
            turbidity = float(np.mean(_months(self.site)))
        clear, diffuse, _ = clear_beam(position, None, turbidity=turbidity, **self._place)
        return SunStates(
            times=np.full(n, np.datetime64("NaT", "us")),
            azimuth_rad=position.azimuth_rad,
            elevation_rad=elevation,
            radius_rad=position.radius_rad,
            beam=clear if beam is None else np.where(elevation > 0.0, beam, 0.0),
            diffuse=diffuse,
            temperature_c=np.full(n, DEFAULT_TEMPERATURE_C),
            wind_ms=np.full(n, DEFAULT_WIND_MS),
            capped=np.zeros(n, dtype=bool),
        )


def _months(site: Site) -> Floats:
    """Table values near the middle of each month, (12,)."""
    middles = np.array([f"2025-{m:02d}-15" for m in range(1, 13)], dtype="datetime64[us]")
    return table_turbidity(middles, latitude_deg=site.latitude, longitude_deg=site.longitude)


def _turbidity_sentence(site: Site) -> str:
    monthly = _months(site)
    return (
        f"The clear-sky beam uses the monthly table of Linke turbidity for the site (Remund et "
        f"al. 2003, as pvlib carries it): {monthly.min():.1f} to {monthly.max():.1f}."
    )
