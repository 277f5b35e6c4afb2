"""Weather files, invented for these tests: true to their formats, of no real place or year."""

import calendar

import numpy as np
import pytest

EPW_HEAD = """\
LOCATION,{name},Invented,XXX,invented,000000,{lat},{lon},{tz},{elev}
DESIGN CONDITIONS,0
TYPICAL/EXTREME PERIODS,0
GROUND TEMPERATURES,0
HOLIDAYS/DAYLIGHT SAVINGS,No,0,0,0
COMMENTS 1,invented for a test
COMMENTS 2,
DATA PERIODS,1,1,Data,Sunday, 1/ 1,12/31
"""
TMY3_COLUMNS = (
    "Date (MM/DD/YYYY),Time (HH:MM),ETR (W/m^2),ETRN (W/m^2),GHI (W/m^2),GHI source,"
    "GHI uncert (%),DNI (W/m^2),DNI source,DNI uncert (%),DHI (W/m^2),DHI source,DHI uncert (%),"
    "Dry-bulb (C),Dry-bulb source,Dry-bulb uncert (code),Wspd (m/s),Wspd source,"
    "Wspd uncert (code)\n"
)


def hours_of(year):
    """(month, day, hour 1 to 24) of each hour of a year."""
    return [
        (month, day, hour)
        for month in range(1, 13)
        for day in range(1, calendar.monthrange(year, month)[1] + 1)
        for hour in range(1, 25)
    ]


def series(values, hours):
    """One value for each hour, from a number or a function of (month, day, hour)."""
    return [values(*h) if callable(values) else values for h in hours]


@pytest.fixture
def write_epw(tmp_path):
    def write(
        *, dni=0.0, dhi=0.0, temperature=10.0, wind=2.0, lat=51.07, lon=-1.32, tz=0.0, elev=40.0,
        year=2009, name="Oxbow Airfield", edit=None,
    ):  # fmt: skip
        hours = hours_of(year)
        columns = [series(v, hours) for v in (dni, dhi, temperature, wind)]
        lines = []
        for (month, day, hour), b, d, t, w in zip(hours, *columns, strict=True):
            row = ["0"] * 35
            row[:6] = [str(year), str(month), str(day), str(hour), "60", "?9"]
            row[6], row[14], row[15], row[21] = f"{t:g}", f"{b:g}", f"{d:g}", f"{w:g}"
            lines.append(",".join(row))
        lines = edit(lines) if edit else lines
        path = tmp_path / "invented.epw"
        head = EPW_HEAD.format(name=name, lat=lat, lon=lon, tz=tz, elev=elev)
        path.write_text(head + "\n".join(lines) + "\n", encoding="latin-1")
        return path

    return write


@pytest.fixture
def write_tmy3(tmp_path):
    def write(*, dni=0.0, dhi=0.0, temperature=10.0, wind=2.0, tz=-7.0, lat=39.7, lon=-105.2):
        hours = hours_of(2003)
        columns = [series(v, hours) for v in (dni, dhi, temperature, wind)]
        lines = []
        for (month, day, hour), b, d, t, w in zip(hours, *columns, strict=True):
            # Each month of a typical year is from a year of its own; here February's is a leap year
            year = 2004 if month == 2 else 1990 + month
            lines.append(
                f"{month:02d}/{day:02d}/{year},{hour:02d}:00,0,0,0,1,0,{b:g},1,0,{d:g},1,0,"
                f"{t:g},A,7,{w:g},A,7"
            )
        path = tmp_path / "invented.csv"
        path.write_text(
            f'000000,"MADE UP MESA",XX,{tz},{lat},{lon},1800\n' + TMY3_COLUMNS + "\n".join(lines)
        )
        return path

    return write


@pytest.fixture
def rng():
    return np.random.default_rng(20260621)
