"""Thin-film coatings solved by tmm: an oracle that shares no code with the project."""

import numpy as np
import tmm

GLASS = 1.52
# Real films, ordered from the air to the glass: indices, thicknesses (nm), wavelength (nm).
# Refractive indices from memory; only their kind matters here.
FILMS = {
    "one silver layer, visible": ([2.0, 0.06 + 3.6j, 2.0], [40, 12, 40], 550.0),
    "one silver layer, near infrared": ([2.0, 0.14 + 6.9j, 2.0], [40, 12, 40], 1000.0),
    "two silver layers, visible": (
        [2.0, 0.06 + 3.6j, 2.0, 0.06 + 3.6j, 2.0],
        [35, 12, 75, 14, 35],
        550.0,
    ),
    "two silver layers, near infrared": (
        [2.0, 0.14 + 6.9j, 2.0, 0.14 + 6.9j, 2.0],
        [35, 12, 75, 14, 35],
        1000.0,
    ),
    "chromium between oxides": ([2.0, 3.1 + 3.3j, 2.0], [30, 10, 30], 550.0),
    "titanium nitride": ([1.3 + 2.0j], [25], 600.0),
    "steel": ([2.9 + 3.1j], [8], 600.0),
    "tin oxide": ([1.9], [300], 550.0),
}


def film_alone(name):
    """Reflectance from air and from glass and transmittance at normal incidence."""
    index, d, wave = FILMS[name]
    there = tmm.coh_tmm("s", [1, *index, GLASS], [np.inf, *d, np.inf], 0.0, wave)
    back = tmm.coh_tmm("s", [GLASS, *index[::-1], 1], [np.inf, *d[::-1], np.inf], 0.0, wave)
    return there["R"], back["R"], there["T"]


def unit(name, surface, panes, angle_deg, kd=0.0, thickness_nm=6e6):
    """Reflectance (s, p) and transmittance (s, p) of a whole unit, incoherent between faces.

    ``name`` None for no film; ``kd`` is the absorption exponent of a pane at normal incidence.
    """
    index, d, wave = FILMS[name] if name else ([], [], 550.0)
    glass = GLASS + 1j * kd * wave / (4 * np.pi * thickness_nm)
    n, widths, kinds = [1.0], [np.inf], ["i"]
    for k in range(panes):
        for face, material, width in ((2 * k + 1, glass, thickness_nm), (2 * k + 2, 1.0, 1.2e7)):
            if face == surface:
                films = list(zip(index, d, strict=True))
                for m, w in films if face % 2 else films[::-1]:
                    n.append(m)
                    widths.append(w)
                    kinds.append("c")
            n.append(material)
            widths.append(width)
            kinds.append("i")
    widths[-1] = np.inf
    got = [tmm.inc_tmm(pol, n, widths, kinds, np.radians(angle_deg), wave) for pol in "sp"]
    return np.array([g["R"] for g in got]), np.array([g["T"] for g in got])
