"""Eyes: after-image, retinal burn and exposure limits. The veil of glare is in ``glare``.

Angles are radians. How large an image is on the retina must come from the images as they are
seen: two images of the sun side by side are not one image of twice the size, and images that
touch are one.
"""

from __future__ import annotations

from enum import IntEnum
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from causticload.errors import InputError
from causticload.hazard._checks import Floats, Ranged, within

__all__ = [
    "EYE_CLASS_WORDS",
    "EyeClass",
    "EyeLoad",
    "ImageClusters",
    "after_image_limit",
    "angle_from_gaze",
    "assess_eyes",
    "burn_limit",
    "cluster_images",
    "corneal_irradiance",
    "icnirp_blue_small_source_limit",
    "icnirp_infrared_limit",
    "icnirp_retinal_limit",
    "retinal_irradiance",
    "subtense",
]

# Ho, Ghanbari & Diver, J. Solar Energy Eng. 133 (2011) 031021; from memory, high.
PUPIL_M = 0.002  # daylight pupil, diameter
FOCAL_LENGTH_M = 0.017  # of the eye
TRANSMISSION = 0.5  # of the media of the eye
_PER_CM2 = 1.0e4  # W/m² in one W/cm²
BURN_KNEE_RAD = 0.118

EYE_RESOLUTION_RAD = np.deg2rad(1.0 / 60.0)  # one minute of arc, common practice

# Share of the solar beam in a band, for the ASTM G173 direct spectrum (280 to 4000 nm). Derived.
# R(lambda), shape from memory: 1 for 380 to 700 nm, 10^((700 - nm)/500) to 1050, 0.2 to 1150,
# 0.2 * 10^(0.02 (1150 - nm)) to 1200, 0.02 to 1400.
RETINAL_SHARE = 0.608
INFRARED_SHARE = 0.449  # 780 to 3000 nm
BLUE_SHARE = 0.0858  # weighted by B(lambda)


class EyeClass(IntEnum):
    """What one look at a source can do, by Ho, Ghanbari & Diver."""

    LOW = 0
    AFTER_IMAGE = 1
    RETINAL_BURN = 2


EYE_CLASS_WORDS: dict[EyeClass, str] = {
    EyeClass.LOW: "low potential for an after-image",
    EyeClass.AFTER_IMAGE: "can leave a temporary after-image in one look",
    EyeClass.RETINAL_BURN: "can burn the retina before a person blinks",
}


class EyeLoad(NamedTuple):
    """Retinal load of sources. All arrays in one shape."""

    retinal: Floats  # W/m² on the retina, within each image
    after_image_limit: Floats  # W/m² on the retina
    burn_limit: Floats  # W/m² on the retina
    eye_class: NDArray[np.int64]  # values of EyeClass


class ImageClusters(NamedTuple):
    """Images that touch in the field of view, joined. ``k`` clusters of ``m`` images."""

    cluster: NDArray[np.int64]  # (m,) cluster of each image
    direction: Floats  # (k, 3) unit, from the eye, mean weighted by irradiance
    solid_angle: Floats  # (k,) sr
    corneal: Floats  # (k,) W/m²
    subtense: Floats  # (k,) rad


def subtense(solid_angle: ArrayLike) -> Floats:
    """Angle across the round source that has a given solid angle.

    Parameters
    ----------
    solid_angle : array_like of float
        In [0, 2 pi]. [sr]

    Returns
    -------
    angle : ndarray of float
        Full angle. [rad]
    """
    omega = within("solid_angle", solid_angle, 0.0, 2.0 * np.pi)
    return np.asarray(4.0 * np.arcsin(np.sqrt(omega / (4.0 * np.pi))))


def corneal_irradiance(radiance: ArrayLike, *, solid_angle: ArrayLike) -> Floats:
    """Irradiance at the eye, normal to the source, from a small bright area.

    Parameters
    ----------
    radiance : array_like of float
        Mean radiance of the bright area, >= 0. [W m^-2 sr^-1]
    solid_angle : array_like of float
        Its solid angle at the eye, >= 0. [sr]

    Returns
    -------
    corneal : ndarray of float
        [W/m²]
    """
    return np.asarray(within("radiance", radiance) * within("solid_angle", solid_angle))


def retinal_irradiance(corneal: ArrayLike, *, angle: ArrayLike) -> Floats:
    """Irradiance within the image on the retina.

    Parameters
    ----------
    corneal : array_like of float
        Irradiance at the cornea from this image, >= 0. [W/m²]
    angle : array_like of float
        Angle across the image as seen, > 0. [rad]

    Returns
    -------
    retinal : ndarray of float
        [W/m²]

    References
    ----------
    Ho, Ghanbari & Diver (2011): E_r = E_c (d_p/d_r)² tau, d_r = f omega. Constants from memory.
    """
    spread = FOCAL_LENGTH_M * within("angle", angle, above=True)
    return np.asarray(within("corneal", corneal) * (PUPIL_M / spread) ** 2 * TRANSMISSION)


def burn_limit(angle: ArrayLike) -> Floats:
    """Retinal irradiance that burns within the time of a blink, about 0.15 s.

    Parameters
    ----------
    angle : array_like of float
        Angle across the image as seen, > 0. [rad]

    Returns
    -------
    limit : ndarray of float
        [W/m²]

    References
    ----------
    Ho, Ghanbari & Diver (2011): 0.118/omega W/cm² below 0.118 rad, then 1 W/cm². From memory.
    """
    omega = within("angle", angle, above=True)
    return np.asarray(_PER_CM2 * np.maximum(BURN_KNEE_RAD / omega, 1.0))


def after_image_limit(angle: ArrayLike) -> Floats:
    """Retinal irradiance that leaves a temporary after-image.

    Parameters
    ----------
    angle : array_like of float
        Angle across the image as seen, > 0. [rad]

    Returns
    -------
    limit : ndarray of float
        [W/m²]

    References
    ----------
    Ho, Ghanbari & Diver (2011): 3.59e-5/omega^1.77 W/cm². From memory.
    """
    return np.asarray(_PER_CM2 * 3.59e-5 / within("angle", angle, above=True) ** 1.77)


def assess_eyes(*, corneal: ArrayLike, angle: ArrayLike, images: ArrayLike = 1) -> EyeLoad:
    """Retinal load and class of sources as they are seen.

    Parameters
    ----------
    corneal : array_like of float
        Irradiance at the cornea, all separate images of the source together, >= 0. [W/m²]
    angle : array_like of float
        Angle across *one* image, > 0. [rad]
    images : array_like of int
        Number of separate images that share the irradiance evenly, >= 1.

    Returns
    -------
    load : EyeLoad
        Arrays in the broadcast shape.
    """
    each = within("corneal", corneal) / within("images", images, 1.0)
    retinal = retinal_irradiance(each, angle=angle)
    flash, burn = after_image_limit(angle), burn_limit(angle)
    sort = np.where(
        retinal >= burn,
        EyeClass.RETINAL_BURN,
        np.where(retinal >= flash, EyeClass.AFTER_IMAGE, EyeClass.LOW),
    )
    shape = retinal.shape
    return EyeLoad(retinal, np.broadcast_to(flash, shape), np.broadcast_to(burn, shape), sort)


def _unit(name: str, vectors: ArrayLike) -> Floats:
    """Rows scaled to length 1; a zero, nan or wrongly shaped row is an InputError."""
    rows = np.asarray(vectors, dtype=np.float64)
    if rows.ndim < 1 or rows.shape[-1] != 3:
        raise InputError(f"{name} must have three components, got shape {rows.shape}")
    length = np.linalg.norm(rows, axis=-1, keepdims=True)
    if not (np.isfinite(length).all() and (length > 0.0).all()):
        raise InputError(f"{name} must be finite and longer than zero")
    return np.asarray(rows / length)


def angle_from_gaze(directions: ArrayLike, gaze: ArrayLike) -> Floats:
    """Angle between the line of sight and sources.

    Parameters
    ----------
    directions : (..., 3) array_like of float
        From the eye to the sources; any length but zero.
    gaze : (..., 3) array_like of float
        Line of sight; any length but zero.

    Returns
    -------
    angle : ndarray of float
        In [0, pi], exact to rounding near 0 as well. [rad]
    """
    d, g = _unit("directions", directions), _unit("gaze", gaze)
    across = np.linalg.norm(np.cross(d, g), axis=-1)
    return np.asarray(np.arctan2(across, (d * g).sum(axis=-1)))


def cluster_images(
    directions: ArrayLike,
    *,
    solid_angles: ArrayLike,
    corneal: ArrayLike,
    gap: float = float(EYE_RESOLUTION_RAD),
) -> ImageClusters:
    """Join images of the sun that touch as seen from the eye.

    Each image counts as a disc of its solid angle; two are joined if the discs are no further
    apart than ``gap``. Solid angles add up: images are taken not to cover each other.

    Parameters
    ----------
    directions : (m, 3) array_like of float
        From the eye to the middle of each image.
    solid_angles : (m,) array_like of float
        Solid angle of each image at the eye, > 0. [sr]
    corneal : (m,) array_like of float
        Irradiance at the cornea from each image, > 0. [W/m²]
    gap : float
        Largest gap that the eye does not resolve, >= 0. [rad]

    Returns
    -------
    clusters : ImageClusters
        Numbered in the order in which their first image comes.
    """
    d = _unit("directions", directions).reshape(-1, 3)
    omega = within("solid_angles", solid_angles, above=True)
    e = within("corneal", corneal, above=True)
    if not omega.shape == e.shape == (len(d),):
        raise InputError(
            f"directions, solid_angles and corneal must agree in length, "
            f"got {len(d)}, {omega.shape} and {e.shape}"
        )
    radius = subtense(omega) / 2.0
    blind = float(within("gap", gap))
    furthest = min(2.0 * radius.max(initial=0.0) + blind, np.pi)
    pairs = cKDTree(d).query_pairs(2.0 * np.sin(furthest / 2.0) * 1.0001, output_type="ndarray")
    first, second = pairs[:, 0], pairs[:, 1]
    touch = angle_from_gaze(d[first], d[second]) <= radius[first] + radius[second] + blind
    links = coo_array((np.ones(touch.sum()), (first[touch], second[touch])), shape=(len(d), len(d)))
    count, label = connected_components(links, directed=False)
    mean = np.zeros((count, 3))
    np.add.at(mean, label, d * e[:, None])
    total = np.bincount(label, omega, count).astype(np.float64)
    return ImageClusters(
        cluster=label.astype(np.int64),
        direction=_unit("direction of a cluster", mean),
        solid_angle=total,
        corneal=np.bincount(label, e, count).astype(np.float64),
        subtense=subtense(total),
    )


def icnirp_retinal_limit(angle: ArrayLike, *, duration_s: ArrayLike) -> Ranged:
    """Retinal thermal limit, as radiance weighted by R(lambda), 380 to 1400 nm.

    It supposes a wide pupil, so the sun itself is always above it.

    Parameters
    ----------
    angle : array_like of float
        Angle across the source, > 0. [rad]
    duration_s : array_like of float
        Duration of the look, > 0. [s]

    Returns
    -------
    limit : Ranged
        ``value`` in W m^-2 sr^-1; nan and not in range below 1 microsecond. Above 0.25 s it does
        not fall further.

    References
    ----------
    ICNIRP, Health Phys. 105(1) (2013) 74-96: 2.0e4/(alpha t^0.25), 2.8e4/alpha from 0.25 s, with
    alpha held between 1.5 mrad and 5 mrad (to 625 microseconds), 200 t^0.5 mrad, 100 mrad (from
    0.25 s). From memory, high.
    """
    t = within("duration_s", duration_s, above=True)
    largest = np.clip(0.2 * np.sqrt(t), 0.005, 0.1)
    alpha = np.clip(within("angle", angle, above=True), 0.0015, largest)
    value = np.where(t >= 0.25, 2.8e4 / alpha, 2.0e4 / (alpha * t**0.25))
    known = np.broadcast_to(t >= 1e-6, value.shape)
    return Ranged(np.where(known, value, np.nan), known)


def icnirp_infrared_limit(duration_s: ArrayLike) -> Floats:
    """Limit for cornea and lens, 780 to 3000 nm.

    Parameters
    ----------
    duration_s : array_like of float
        Duration of the exposure, > 0. [s]

    Returns
    -------
    limit : ndarray of float
        Infrared irradiance at the cornea; of direct sunlight, 0.449 is in the band. [W/m²]

    References
    ----------
    ICNIRP, Health Phys. 105(1) (2013) 74-96: 18 000 t^-0.75 to 1000 s, then 100. From memory, high.
    """
    t = within("duration_s", duration_s, above=True)
    return np.where(t <= 1000.0, 18000.0 * t**-0.75, 100.0)


def icnirp_blue_small_source_limit(duration_s: ArrayLike) -> Floats:
    """Blue-light limit for sources under 11 mrad, such as one image of the sun.

    Parameters
    ----------
    duration_s : array_like of float
        Duration of the exposure, > 0. [s]

    Returns
    -------
    limit : ndarray of float
        Irradiance weighted by B(lambda) at the cornea. [W/m²]

    References
    ----------
    ICNIRP, Health Phys. 105(1) (2013) 74-96: E_B t <= 100 J/m² to 100 s, then 1 W/m². From
    memory, high.
    """
    t = within("duration_s", duration_s, above=True)
    return np.where(t < 100.0, 100.0 / t, 1.0)
