"""What must be said beside a figure: the fixed cautions, and how sure a figure is.

The sentences stand here once, so that the terminal, the memo and the drawings say the same.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import Literal

__all__ = [
    "CONFIDENCE_MEANING",
    "EYES",
    "GENERAL",
    "SKIN",
    "THINGS",
    "Confidence",
    "Protects",
    "cautions_for",
]

Protects = Literal["people: skin", "people: eyes", "things"]

Confidence = Literal[
    "published, read",
    "derived",
    "from memory, high",
    "from memory, medium",
    "from memory, low",
    "common practice",
    "study file",
]

CONFIDENCE_MEANING: dict[Confidence, str] = {
    "published, read": "The value was read in a published text, often one that quotes the source.",
    "derived": "The value follows from the others named beside it.",
    "from memory, high": "Recalled from the source with high confidence. Check it there.",
    "from memory, medium": "Recalled from the source with medium confidence. Check it there.",
    "from memory, low": "Recalled with low confidence. Never a default. Check it in the source.",
    "common practice": "A fact of the trade without a published source.",
    "study file": "Set by the user in the study file.",
}

GENERAL: tuple[str, ...] = (
    "This is a screening aid. It is not a certificate and not a substitute for the judgement of "
    "a licensed professional.",
    "Local codes, the planning authority and licensed practice decide. Where they are stricter, "
    "they rule.",
    "A figure under a limit does not show that nobody can be hurt and nothing can be damaged. "
    "It holds for the model, the glass data and the sky that were given.",
)

SKIN: tuple[str, ...] = (
    "Skin limits are for healthy adults who can move away. Children, older people, people with "
    "reduced feeling and people who cannot move can be hurt sooner and by less.",
    "Skin limits come from tests with flames and lamps. Sunlight enters the skin deeper, and "
    "sunburn by ultraviolet light is not counted.",
    "Metal, stone and dark plastic in a hot spot can burn a hand that touches them, at loads "
    "that do not burn skin by radiation alone.",
)

EYES: tuple[str, ...] = (
    "Never look into a reflection of the sun to check it, and never through a lens or a finder.",
    "Eye limits assume that a person blinks and turns away. Optical instruments, wide pupils and "
    "people who cannot turn away need a separate study.",
    "Glare for drivers, pilots and signals is decided by the authority for that road, airfield or "
    "railway.",
)

THINGS: tuple[str, ...] = (
    "Softening and ignition differ widely between products. Use the maker's data for the product "
    "that stands there.",
    "Wood and litter can smoulder at low loads and flare up hours later. Dirt, char and dark "
    "paint raise what a surface takes up.",
    "Things can be put into a hot spot after the study: parked cars, stalls, awnings, bins.",
)

_BY_PROTECTS: dict[Protects, tuple[str, ...]] = {
    "people: skin": SKIN,
    "people: eyes": EYES,
    "things": THINGS,
}


def cautions_for(protects: Iterable[Protects]) -> tuple[str, ...]:
    """All cautions that belong beside figures of these sorts, in a fixed order.

    Parameters
    ----------
    protects : iterable of str
        Whom or what the criteria protect, such as ``"people: skin"``. Repeats are allowed.

    Returns
    -------
    sentences : tuple of str
        The general cautions first; never empty.
    """
    wanted = set(protects)
    special = [s for sort, sentences in _BY_PROTECTS.items() if sort in wanted for s in sentences]
    return (*GENERAL, *special)
