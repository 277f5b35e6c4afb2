"""What a peak does and what would cure it: skin, surfaces, panels, and how sure that is."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from causticload.hazard.contact import ContactGroup, contact_burn_threshold_c
from causticload.hazard.findings import (
    Confidence,
    Contributor,
    Episode,
    LeastPanels,
    PeakCheck,
    SkinFinding,
    SurfaceFinding,
)
from causticload.hazard.histories import History
from causticload.hazard.material_table import Material, material
from causticload.hazard.materials import Surroundings, sky_view
from causticload.hazard.skin import (
    ISO_13571_BURN,
    ISO_13571_PAIN,
    WALKING_SPEED,
    dose,
    spot_crossing_dose,
    time_to_effect,
)
from causticload.hazard.transient import surface_history
from causticload.scene.model import Floats
from causticload.scene.tessellation import CARRIES, MARGINAL

# What a receiver is taken to be made of when the study does not say: the usual thing of its kind
# that bears least (common practice).
USUAL_MATERIAL: dict[str, str] = {
    "facade": "vinyl cladding",
    "roadway": "asphalt",
    "parking": "car dashboard",
    "roof": "roofing felt",
    "planting": "fabric, paper or leaf litter",
    "terrace": "softwood",
    "playground": "rubber",
}
OTHERWISE = "concrete"
_TOUCH: dict[str, ContactGroup] = {
    "concrete": "ceramic, glass, stone",
    "brick": "ceramic, glass, stone",
    "asphalt": "ceramic, glass, stone",
    "annealed glass": "ceramic, glass, stone",
    "galvanised steel": "bare metal",
    "aluminium": "bare metal",
    "stainless steel": "bare metal",
    "softwood": "wood",
    "hardwood": "wood",
    "plywood": "wood",
    "paint film on wood": "wood",
}
_TOUCH_TIMES = (1.0, 10.0, 60.0, 600.0)  # s
CALMEST = 4.9  # m/s: the law of convection does not go further
NEAR_LIMIT = 0.1


def material_of(kind: str, named: str) -> Material:
    """Choose what a receiver is made of.

    Parameters
    ----------
    kind : str
        Kind of the receiver.
    named : str
        Material given in the study; empty for none.

    Returns
    -------
    material : Material
        The one named, else the usual one of the kind.

    Raises
    ------
    InputError
        If there is no material of that name.
    """
    return material(named or USUAL_MATERIAL.get(kind, OTHERWISE))


def assess_skin(history: History, check: PeakCheck, *, absorbed_share: float = 1.0) -> SkinFinding:
    """Say what a person takes in who stands at a peak, and one who walks through.

    Parameters
    ----------
    history : History
        Loads at the peak's place through its day.
    check : PeakCheck
        The peak.
    absorbed_share : float
        Share of the light that skin takes up, in (0, 1]; 1 is the upper bound.

    Returns
    -------
    finding : SkinFinding
        Doses by ISO 13571, whose time law is from memory.
    """
    flux = absorbed_share * history.total
    pain = dose(history.seconds, flux, law=ISO_13571_PAIN)
    burn = dose(history.seconds, flux, law=ISO_13571_BURN)
    peak = absorbed_share * check.total
    soon = float(time_to_effect(peak, law=ISO_13571_PAIN, extrapolate=True).value)
    walking = spot_crossing_dose(
        flux=peak, diameter_m=max(check.width, 0.05), law=ISO_13571_PAIN, speed=WALKING_SPEED
    )
    seconds = soon if np.isfinite(soon) and peak > ISO_13571_PAIN.flux_min else None
    d = float(pain.value)
    stays = (
        f"A person who stays at the spot all day gathers {_times(d)} the dose of pain and "
        f"{_times(float(burn.value))} that of a second-degree burn"
        if d >= 1.0
        else f"A person who stays at the spot gathers {d:.2f} of the dose of pain"
    )
    soon_said = "under a second" if soon < 1.0 else f"about {soon:.0f} s"
    when = f"; at the peak's load pain comes in {soon_said}" if seconds else ""
    return SkinFinding(
        absorbed_share=absorbed_share,
        pain_dose=d,
        burn_dose=float(burn.value),
        seconds_to_pain=seconds,
        walking_speed=WALKING_SPEED,
        walking_pain_dose=float(walking.value),
        in_range=bool(pain.in_range) and bool(burn.in_range),
        text=f"{stays}{when}. One who walks straight through at {WALKING_SPEED} m/s gathers "
        f"{float(walking.value):.2f} of it.",
    )


def _times(dose_over_effect: float) -> str:
    """Write a multiple of a dose; past twenty the laws say no more than that it is many."""
    return "over 20 times" if dose_over_effect > 20.0 else f"{dose_over_effect:.1f} times"


def assess_surface(
    history: History, *, thing: Material, normal_up: float
) -> tuple[SurfaceFinding, Floats, Floats]:
    """Say how hot a surface gets through a day, with the facade and without it.

    Parameters
    ----------
    history : History
        Loads at its place.
    thing : Material
        What it is made of.
    normal_up : float
        Upward component of its unit normal.

    Returns
    -------
    finding : SurfaceFinding
        Peaks and the limit.
    surface_c, without_c : (n,) float
        Temperature at the history's times. [°C]
    """
    around = Surroundings(
        air_c=float(history.air_c.mean()),
        wind=float(min(CALMEST, history.wind.mean())),
        sky_view=float(sky_view(min(1.0, max(-1.0, normal_up)))),
    )
    both = np.stack([history.total, history.plain], axis=1)
    t = surface_history(
        history.seconds, both, material=thing, surroundings=around, air_c=history.air_c
    )
    hot, plain = t[:, 0], t[:, 1]
    bearing = [x for x in thing.limits if x.quantity == "temperature"]
    limit = min(bearing, key=lambda x: x.low, default=None)
    minutes = 0.0
    if limit is not None:
        over = hot > limit.low
        minutes = float((np.diff(history.seconds) * (over[1:] & over[:-1])).sum() / 60.0)
    touch = _shortest_touch(thing, float(hot.max()))
    said = (
        f"{thing.name[:1].upper() + thing.name[1:]} (absorptance {thing.absorptance:g}) reaches "
        f"{hot.max():.0f} °C there on that day, {plain.max():.0f} °C without the facade"
    )
    if limit is not None:
        said += f"; its lowest {limit.kind} limit is {limit.low:g} °C ({limit.confidence})"
    if touch is not None:
        said += f"; a touch of {touch:g} s can burn"
    return (
        SurfaceFinding(
            material=thing.name,
            absorptance=thing.absorptance,
            peak_c=float(hot.max()),
            peak_without_c=float(plain.max()),
            limit_c=None if limit is None else limit.low,
            limit_kind="" if limit is None else limit.kind,
            minutes_over=minutes,
            contact_seconds=touch,
            text=said + ".",
        ),
        hot,
        plain,
    )


def _shortest_touch(thing: Material, surface_c: float) -> float | None:
    """Shortest of the tabled touches that burns; None if ten minutes do not."""
    group = _TOUCH.get(thing.name, "plastic")
    for seconds in _TOUCH_TIMES:
        if surface_c >= float(contact_burn_threshold_c(seconds, group=group).value):
            return seconds
    return None


def least_panels(
    contributors: Sequence[Contributor], *, reflected: float, other: float, limit: float
) -> LeastPanels:
    """Find the fewest panels without which a peak is under its limit.

    Loads of panels add up, so taking the strongest first is the least set. It holds for this
    peak: another panel's light may then be the strongest elsewhere.

    Parameters
    ----------
    contributors : sequence of Contributor
        Strongest first.
    reflected : float
        Reflected load at the peak. [W/m²]
    other : float
        What else counts towards the limit there: direct and diffuse light. [W/m²]
    limit : float
        The limit. [W/m²]

    Returns
    -------
    least : LeastPanels
        The panels, and the factor on all contributors' reflectance that does it too.
    """
    left = reflected
    chosen: list[int] = []
    for c in contributors:
        if left + other <= limit:
            break
        chosen.append(c.panel)
        left = max(0.0, left - c.load)
    enough = left + other <= limit
    room = limit - other
    factor = room / reflected if reflected > room > 0.0 else (1.0 if room >= reflected else None)
    if not enough:
        text = (
            "Sun and sky alone are over the limit there, or second reflections keep it so: no "
            "change of these panels brings the peak under it."
        )
    else:
        count = len(chosen)
        text = (
            f"Without the strongest {count} of {len(contributors)} panels, or with "
            f"{100.0 * (factor or 0.0):.0f} % of the reflectance on all of them, this peak is "
            f"under the limit. Run the changed study: the peak may move."
        )
    return LeastPanels(
        panels=tuple(chosen),
        reflected_left=left,
        enough=enough,
        reflectance_factor=factor,
        text=text,
    )


def grade(
    episode: Episode, *, tessellation_share: float, glass_range: float, weather: bool
) -> Confidence:
    """Say how far a finding can be relied on.

    Parameters
    ----------
    episode : Episode
        Looked at closely.
    tessellation_share : float
        Shift of an image that the mesh leaves open, over the diameter of the sun's image. [1]
    glass_range : float
        Half the range that the glass data leave, over the value.
    weather : bool
        Whether a weather file was used.

    Returns
    -------
    confidence : Confidence
        "firm" with nothing against it, "fair" with one thing, "weak" with more, or with a ray
        count that disagrees or a mesh that cannot carry the answer.
    """
    check = episode.check
    against: list[str] = []
    worst = False
    reasons: list[str] = []
    if check is None:
        against.append("The peak was not counted with random rays.")
    elif check.agrees:
        reasons.append("Ray tubes and the ray count agree.")
    else:
        worst = True
        against.append("Ray tubes and the ray count disagree.")
    if tessellation_share > CARRIES:
        worst = worst or tessellation_share > MARGINAL
        against.append(
            f"The mesh leaves images open by {100 * tessellation_share:.0f} % of the sun's own."
        )
    else:
        reasons.append("The mesh carries the answer.")
    if glass_range > 0.15:
        against.append(f"The glass data leave ± {100 * glass_range:.0f} % open.")
    over = episode.peak / episode.limit - 1.0
    if over < NEAR_LIMIT:
        against.append(f"The peak is only {100 * over:.0f} % over the limit.")
    else:
        reasons.append(f"The peak is {100 * over:.0f} % over the limit.")
    reasons.append(
        "Beam from a weather file: an average year."
        if weather
        else "Clear sky at every step: no cloud is counted, so days and minutes are upper bounds."
    )
    name = "weak" if worst or len(against) > 1 else ("fair" if against else "firm")
    return Confidence(grade=name, reasons=(*against, *reasons))
