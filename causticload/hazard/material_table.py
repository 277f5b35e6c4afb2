"""Things that stand in a hot spot: what they are made of and what they bear.

Thermal properties marked ISO 10456 or CIBSE were read in a published list of that standard or
guide. Absorptances are for sunlight; the default is the dark end where colour is open, because
the colour of the thing that will stand there is rarely known. Every limit carries its source.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from causticload.errors import InputError
from causticload.hazard.cautions import Confidence

__all__ = ["MATERIALS", "LimitKind", "LimitQuantity", "Material", "MaterialLimit", "material"]

LimitKind = Literal["softening", "ignition", "service", "fracture", "observed"]
LimitQuantity = Literal["temperature", "irradiance", "temperature difference"]


@dataclass(frozen=True, kw_only=True)
class MaterialLimit:
    """What a material bears. Where sources give a range, ``low`` is the one to use.

    Temperature in °C, temperature difference in K, irradiance (total, incident) in W/m².
    """

    kind: LimitKind
    quantity: LimitQuantity
    low: float
    high: float
    source: str
    confidence: Confidence


@dataclass(frozen=True, kw_only=True)
class Material:
    """Thermal and solar properties of one thing, and its limits."""

    name: str
    conductivity: float  # k, W m^-1 K^-1
    density: float  # rho, kg/m³
    heat_capacity: float  # c, J kg^-1 K^-1
    thickness_m: float | None  # None: thick
    absorptance: float  # of sunlight, default
    absorptance_range: tuple[float, float]
    emissivity: float  # long-wave
    properties_source: str
    properties_confidence: Confidence
    absorptance_source: str
    absorptance_confidence: Confidence
    limits: tuple[MaterialLimit, ...] = ()

    @property
    def effusivity(self) -> float:
        """How strongly the body draws heat.

        Returns
        -------
        effusivity : float
            sqrt(k rho c). [W s^0.5 m^-2 K^-1]
        """
        return float((self.conductivity * self.density * self.heat_capacity) ** 0.5)

    @property
    def diffusivity(self) -> float:
        """How fast heat spreads in the body.

        Returns
        -------
        diffusivity : float
            k/(rho c). [m²/s]
        """
        return self.conductivity / (self.density * self.heat_capacity)

    def limit(self, kind: LimitKind, quantity: LimitQuantity = "temperature") -> MaterialLimit:
        """The lowest limit of a kind.

        Parameters
        ----------
        kind : str
            Such as "softening".
        quantity : str
            "temperature", "irradiance" or "temperature difference".

        Returns
        -------
        limit : MaterialLimit
            The one with the smallest ``low``.

        Raises
        ------
        InputError
            If the material has none of that kind.
        """
        fitting = [x for x in self.limits if x.kind == kind and x.quantity == quantity]
        if not fitting:
            raise InputError(f"{self.name} has no {kind} limit of {quantity}")
        return min(fitting, key=lambda x: x.low)


READ: Confidence = "published, read"
HIGH: Confidence = "from memory, high"
MEDIUM: Confidence = "from memory, medium"
LOW: Confidence = "from memory, low"
ISO_10456 = "prEN 12524 / ISO 10456"
CIBSE = "CIBSE Guide A, table 3.36"
ABSORPTANCES = "published lists of solar absorptance"
PLASTIC_COLOURS = "white 0.25 to 0.35, mid 0.5 to 0.65, dark 0.8 to 0.9"


def _temperature(
    kind: LimitKind, low: float, high: float, source: str, confidence: Confidence
) -> MaterialLimit:
    return MaterialLimit(
        kind=kind,
        quantity="temperature",
        low=low,
        high=high,
        source=source,
        confidence=confidence,
    )


def _irradiance(low: float, high: float, source: str, confidence: Confidence) -> MaterialLimit:
    return MaterialLimit(
        kind="ignition",
        quantity="irradiance",
        low=low,
        high=high,
        source=source,
        confidence=confidence,
    )


PVC_IGNITION = _temperature("ignition", 399.0, 399.0, "rigid PVC ignites above 399 °C", READ)
WOOD_LIMITS = (
    _temperature("service", 77.0, 77.0, "Babrauskas 2007: long-term self-heating", READ),
    _temperature("ignition", 250.0, 250.0, "Babrauskas 2007: short-term ignition", READ),
    _irradiance(4300.0, 4300.0, "Babrauskas 2001: least flux for (glowing) ignition", READ),
    _irradiance(12500.0, 12600.0, "piloted ignition; UK building-separation value", HIGH),
)


def _plastic(
    name: str,
    k_rho_c: tuple[float, float, float],
    *limits: MaterialLimit,
    thickness_m: float = 0.003,
    source: str = ISO_10456,
    confidence: Confidence = READ,
) -> Material:
    """A plastic of open colour."""
    k, rho, c = k_rho_c
    return Material(
        name=name,
        conductivity=k,
        density=rho,
        heat_capacity=c,
        thickness_m=thickness_m,
        absorptance=0.85,
        absorptance_range=(0.25, 0.90),
        emissivity=0.90,
        properties_source=source,
        properties_confidence=confidence,
        absorptance_source=PLASTIC_COLOURS,
        absorptance_confidence=MEDIUM,
        limits=limits,
    )


def _mineral(
    name: str,
    k_rho_c: tuple[float, float, float],
    absorptance: float,
    absorptance_range: tuple[float, float],
    *limits: MaterialLimit,
    thickness_m: float | None = None,
    emissivity: float = 0.90,
    source: str = ISO_10456,
    absorptance_source: str = ABSORPTANCES,
    absorptance_confidence: Confidence = READ,
) -> Material:
    """Stone, metal, bitumen, wood: properties that were read."""
    k, rho, c = k_rho_c
    return Material(
        name=name,
        conductivity=k,
        density=rho,
        heat_capacity=c,
        thickness_m=thickness_m,
        absorptance=absorptance,
        absorptance_range=absorptance_range,
        emissivity=emissivity,
        properties_source=source,
        properties_confidence=READ,
        absorptance_source=absorptance_source,
        absorptance_confidence=absorptance_confidence,
        limits=limits,
    )


def _wood(name: str, k_rho_c: tuple[float, float, float], *more: MaterialLimit) -> Material:
    return _mineral(
        name,
        k_rho_c,
        0.70,
        (0.35, 0.90),
        *WOOD_LIMITS,
        *more,
        absorptance_source="new to weathered and stained wood; char takes up more",
        absorptance_confidence=MEDIUM,
    )


_ALL: tuple[Material, ...] = (
    _plastic(
        "vinyl cladding",
        (0.17, 1390.0, 900.0),
        _temperature(
            "softening", 71.0, 74.0, "Vinyl Siding Institute 2002: typical heat distortion", READ
        ),
        _temperature(
            "observed", 61.0, 61.0, "national-laboratory white paper: lowest distortion", READ
        ),
        PVC_IGNITION,
        thickness_m=0.0011,
    ),
    _plastic(
        "ABS",
        (0.20, 1050.0, 1470.0),
        _temperature("softening", 68.0, 100.0, "heat deflection at 0.46 MPa, data sheets", READ),
        source="typical data sheet",
        confidence=MEDIUM,
    ),
    _plastic(
        "polycarbonate",
        (0.20, 1200.0, 1200.0),
        _temperature(
            "softening", 127.0, 138.0, "heat deflection at 1.8 and 0.45 MPa, data sheets", READ
        ),
    ),
    _plastic(
        "PMMA",
        (0.18, 1180.0, 1500.0),
        _temperature("softening", 75.0, 100.0, "heat deflection at 1.8 MPa", MEDIUM),
    ),
    _plastic(
        "HDPE",
        (0.50, 980.0, 1800.0),
        _temperature("softening", 70.0, 90.0, "heat deflection at 0.45 MPa", MEDIUM),
        _temperature("service", 125.0, 125.0, "IS 4984 (pipe): Vicat softening, at least", READ),
        confidence=MEDIUM,
    ),
    _plastic(
        "polypropylene",
        (0.22, 910.0, 1800.0),
        _temperature("softening", 55.0, 65.0, "heat deflection at 1.8 MPa", MEDIUM),
        confidence=MEDIUM,
    ),
    _plastic(
        "rigid PVC",
        (0.17, 1390.0, 900.0),
        _temperature("softening", 55.0, 75.0, "heat deflection at 1.8 MPa", MEDIUM),
        PVC_IGNITION,
    ),
    _plastic(
        "polyurethane sealant",
        (0.25, 1200.0, 1800.0),
        _temperature("service", 80.0, 90.0, "usual service temperature", MEDIUM),
        thickness_m=0.010,
        confidence=MEDIUM,
    ),
    _plastic(
        "butyl sealant",
        (0.24, 1200.0, 1400.0),
        _temperature("service", 90.0, 100.0, "usual service temperature", MEDIUM),
        thickness_m=0.010,
        confidence=MEDIUM,
    ),
    _plastic(
        "silicone sealant",
        (0.35, 1200.0, 1000.0),
        _temperature("service", 150.0, 200.0, "usual service temperature", MEDIUM),
        thickness_m=0.010,
        confidence=MEDIUM,
    ),
    _plastic(
        "EPDM membrane",
        (0.25, 1150.0, 1000.0),
        _temperature("service", 120.0, 130.0, "usual service temperature", MEDIUM),
        thickness_m=0.0015,
        confidence=MEDIUM,
    ),
    _plastic(
        "car dashboard",
        (0.20, 1050.0, 1470.0),
        _temperature(
            "observed", 74.0, 93.0, "ASU/UCSD 2018 (1 h in the sun) and NWS (dark): plain sun", READ
        ),
        source="taken as ABS",
        confidence=MEDIUM,
    ),
    Material(
        name="fabric, paper or leaf litter",
        conductivity=0.06,
        density=200.0,
        heat_capacity=1340.0,
        thickness_m=0.002,
        absorptance=0.80,
        absorptance_range=(0.30, 0.95),
        emissivity=0.90,
        properties_source="a rough stand-in for loose dry matter",
        properties_confidence=LOW,
        absorptance_source="white paper to dry leaves",
        absorptance_confidence=MEDIUM,
        limits=(
            _irradiance(7000.0, 10000.0, "piloted ignition of dry fine fuels", MEDIUM),
            _temperature("ignition", 218.0, 246.0, "paper, autoignition", MEDIUM),
        ),
    ),
    Material(
        name="paint film on wood",
        conductivity=0.13,
        density=500.0,
        heat_capacity=1600.0,
        thickness_m=None,
        absorptance=0.90,
        absorptance_range=(0.24, 0.95),
        emissivity=0.90,
        properties_source="the softwood under it, ISO 10456; the film itself is left out",
        properties_confidence=READ,
        absorptance_source="white lead 0.24 to black oil paint 0.90, published lists",
        absorptance_confidence=READ,
        limits=(
            _temperature("softening", 60.0, 90.0, "alkyd and acrylic: blisters, softens", LOW),
            _temperature("service", 100.0, 120.0, "discolours", LOW),
        ),
    ),
    _wood("softwood", (0.13, 500.0, 1600.0)),
    _wood("hardwood", (0.18, 700.0, 1600.0)),
    Material(
        name="plywood",
        conductivity=0.13,
        density=500.0,
        heat_capacity=1600.0,
        thickness_m=0.018,
        absorptance=0.70,
        absorptance_range=(0.35, 0.90),
        emissivity=0.90,
        properties_source=ISO_10456,
        properties_confidence=MEDIUM,
        absorptance_source="new to weathered and stained wood; char takes up more",
        absorptance_confidence=MEDIUM,
        limits=(
            *WOOD_LIMITS,
            _irradiance(7500.0, 7500.0, "Fire Saf. J. 2006: 18 mm maple smoulders, to 8 h", READ),
        ),
    ),
    _mineral(
        "asphalt",
        (0.50, 1700.0, 1000.0),
        0.93,
        (0.85, 0.93),
        _temperature("softening", 45.0, 60.0, "paving bitumen, ring and ball", MEDIUM),
        _temperature("observed", 69.0, 69.0, "blacktop in hot plain sun", READ),
        source=CIBSE,
    ),
    _mineral(
        "roofing felt",
        (0.19, 960.0, 840.0),
        0.90,
        (0.85, 0.95),
        _temperature("softening", 85.0, 120.0, "oxidised bitumen, ring and ball", MEDIUM),
        thickness_m=0.005,
        source=CIBSE,
        absorptance_source="as black paint, published lists",
    ),
    _mineral(
        "rubber",
        (0.17, 1500.0, 1470.0),
        0.90,
        (0.80, 0.95),
        _temperature("service", 80.0, 130.0, "usual service temperature, by kind", MEDIUM),
        thickness_m=0.005,
        source=CIBSE,
        absorptance_source="as black paint, published lists",
    ),
    _mineral(
        "annealed glass",
        (1.0, 2500.0, 750.0),
        0.15,
        (0.10, 0.70),
        MaterialLimit(
            kind="fracture",
            quantity="temperature difference",
            low=25.0,
            high=40.0,
            source="difference within a float pane; EN 1863 and EN 12150 give 100 and 200 K for "
            "heat-strengthened and toughened glass",
            confidence=HIGH,
        ),
        thickness_m=0.006,
        absorptance_source="clear to strongly tinted, 6 mm",
        absorptance_confidence=MEDIUM,
    ),
    _mineral(
        "concrete", (1.4, 2100.0, 840.0), 0.65, (0.65, 0.85), source="published list of properties"
    ),
    _mineral(
        "brick", (0.7, 1600.0, 840.0), 0.70, (0.30, 0.70), source="published list of properties"
    ),
    _mineral(
        "galvanised steel",
        (50.0, 7800.0, 450.0),
        0.64,
        (0.64, 0.90),
        thickness_m=0.003,
        emissivity=0.25,
    ),
    _mineral(
        "aluminium",
        (160.0, 2800.0, 880.0),
        0.15,
        (0.10, 0.90),
        thickness_m=0.003,
        emissivity=0.10,
        absorptance_source="sheet 0.15, polished 0.10, anodised 0.14; black paint 0.90",
    ),
    _mineral(
        "stainless steel",
        (17.0, 7900.0, 460.0),
        0.52,
        (0.33, 0.52),
        thickness_m=0.002,
        emissivity=0.20,
    ),
)

MATERIALS: dict[str, Material] = {m.name: m for m in _ALL}


def material(name: str) -> Material:
    """A built-in material.

    Parameters
    ----------
    name : str
        As in ``MATERIALS``.

    Returns
    -------
    material : Material
        Its row.

    Raises
    ------
    InputError
        If there is no such row.
    """
    if name not in MATERIALS:
        raise InputError(f"unknown material {name!r}", hint=f"Known: {', '.join(MATERIALS)}.")
    return MATERIALS[name]
