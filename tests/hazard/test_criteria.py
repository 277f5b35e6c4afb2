"""Limits, who they are for, and the words around them."""

import ast
import re
from dataclasses import FrozenInstanceError
from pathlib import Path

import pytest

import causticload.hazard.criteria as criteria_module
from causticload.errors import StudyError
from causticload.hazard import cautions
from causticload.hazard.criteria import BUILT_IN, KINDS, QUANTITIES, criteria_for, describe
from causticload.study.model import CriterionSpec

CANOPY = CriterionSpec(
    name="market stall canopy",
    applies_to=("canopy*",),
    quantity="total irradiance",
    limit=1500.0,
    minutes=10.0,
)


def names(kind, own=(), receiver="plaza"):
    return [c.name for c in criteria_for(kind, own, receiver)]


def test_published_figures_of_the_defaults():
    """ISO 13571 2.5, API 521 1.58 rounded down, Babrauskas 2001 4.3 kW/m²; litter from memory."""
    limit = {c.name: c.limit for c in BUILT_IN}
    assert limit["skin pain"] == 2500.0
    assert limit["skin, prolonged"] == 1500.0
    assert limit["skin, prolonged"] <= 1580.0
    assert limit["timber, long term"] == 4300.0
    assert limit["combustible litter"] == 7000.0
    # dark vinyl at 71 °C, wall at 30 °C and 1 m/s: 831 W/m², computed independently
    assert limit["vinyl softening"] == pytest.approx(831.0, abs=1.0)


def test_no_default_rests_on_a_figure_of_low_confidence():
    for c in BUILT_IN:
        assert c.confidence != "from memory, low"
        assert c.minutes == 0.0  # no tolerated time was read in a source
        assert c.source
        assert c.validity
        assert c.caution


def test_built_in_rows_are_consistent():
    assert len({c.name for c in BUILT_IN}) == len(BUILT_IN)
    for c in BUILT_IN:
        assert c.quantity in QUANTITIES
        assert c.unit == QUANTITIES[c.quantity]
        assert set(c.applies_to_kinds) <= set(KINDS)
        assert c.confidence in cautions.CONFIDENCE_MEANING
    with pytest.raises(FrozenInstanceError):
        BUILT_IN[0].limit = 1.0


def test_kinds_choose_the_defaults():
    assert names("walkway") == ["skin, prolonged", "skin pain", "combustible litter"]
    assert names("facade") == ["vinyl softening", "timber, long term"]
    assert names("water") == []
    assert names("") == [c.name for c in BUILT_IN]  # not said: everything


def test_own_limits_apply_by_glob_without_regard_to_case():
    assert "market stall canopy" in names("walkway", [CANOPY], "Canopy north")
    assert "market stall canopy" not in names("walkway", [CANOPY], "north canopy")
    own = criteria_for("water", [CANOPY], "canopy")
    assert own[0].limit == 1500.0
    assert own[0].minutes == 10.0
    assert own[0].confidence == "study file"


def test_own_limit_takes_the_place_of_a_built_in_one():
    stricter = CriterionSpec(
        name="skin pain", applies_to=("*",), quantity="reflected irradiance", limit=1000.0
    )
    found = {c.name: c for c in criteria_for("walkway", [stricter], "plaza")}
    assert len(found) == 3
    assert found["skin pain"].limit == 1000.0
    assert found["skin pain"].protects == "people: skin"


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"quantity": "total iradiance"}, "Did you mean 'total irradiance'"),
        ({"limit": 0.0}, "limit must be > 0"),
        ({"limit": float("nan")}, "limit must be > 0"),
        ({"minutes": -1.0}, "minutes must be"),
        ({"minutes": 1441.0}, "minutes must be"),
    ],
)
def test_wrong_own_limits_are_refused_even_where_they_do_not_apply(change, message):
    good = {
        "name": "x",
        "applies_to": ("elsewhere",),
        "quantity": "total irradiance",
        "limit": 1.0,
    }
    with pytest.raises(StudyError) as caught:
        criteria_for("walkway", [CriterionSpec(**{**good, **change})], "plaza")
    assert message in str(caught.value)
    assert "'x'" in str(caught.value)


def test_unknown_kind_and_twice_the_same_name_are_refused():
    with pytest.raises(StudyError, match="walkway"):
        criteria_for("walkwya", [], "plaza")
    with pytest.raises(StudyError, match="two criteria"):
        criteria_for("walkway", [CANOPY, CANOPY], "canopy")


def test_describe_says_all_of_it():
    rows = describe(criteria_for("walkway", [CANOPY], "canopy"))
    assert [row["name"] for row in rows][-1] == "market stall canopy"
    assert rows[-1]["tolerated"] == "10 min a day"
    assert rows[0]["limit"] == "total irradiance 1500 W/m²"
    assert "API 521" in rows[0]["source"]
    assert all(row.keys() == rows[0].keys() and all(row.values()) for row in rows)


def test_cautions_always_include_the_general_ones():
    assert cautions.cautions_for([]) == cautions.GENERAL
    said = cautions.cautions_for(["things", "people: skin", "people: skin"])
    assert said == (*cautions.GENERAL, *cautions.SKIN, *cautions.THINGS)
    text = " ".join(cautions.GENERAL)
    for must in ("screening aid", "not a certificate", "Local codes", "licensed"):
        assert must in text
    assert "Never look" in " ".join(cautions.cautions_for(["people: eyes"]))


def promises(source):
    """Strings of a program text that promise safety; docstrings count."""
    texts = [
        node.value
        for node in ast.walk(ast.parse(source))
        if isinstance(node, ast.Constant) and isinstance(node.value, str)
    ]
    return texts, [text for text in texts if re.search(r"\b(un)?safe(ly)?\b", text, re.IGNORECASE)]


def test_no_string_promises_safety():
    assert promises('x = f"It is Safe, {y}"')[1]  # the search finds what it looks for
    count = 0
    for path in sorted(Path(criteria_module.__file__).parent.glob("*.py")):
        texts, found = promises(path.read_text(encoding="utf-8"))
        assert not found, path.name
        count += len(texts)
    assert count > 300  # it did read the package
