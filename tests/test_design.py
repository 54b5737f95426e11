"""Designs: frozen, hashable, defaults that follow (what they refuse: test_bad_input)."""

from __future__ import annotations

import copy
import math
import pickle
from dataclasses import FrozenInstanceError, replace

import numpy as np
import pytest

from explorer import (
    CAUTIONS,
    QUANTITIES,
    Decision,
    Design,
    InputError,
    Lines,
    Origin,
    Requirement,
    Spread,
    Unknown,
    evaluate,
)
from explorer.design import LONGEST_TEXT, ORIGINS, Frozen, written
from explorer.scatter import SPREADS


def made() -> Design:
    return Design(
        {"lifetime": 3e-9, "quality_factor": 1e4, "spectrum": Lines([(0.9, 0.0, 1e-9)])},
        requirements=(
            Requirement("rate_in_fibre", at_least=2e7),
            Requirement("g2_zero", at_most=0.1),
        ),
        scatter={"resonance_wavelength": Spread("normal", 1e-9)},
        unknowns={"quantum_yield": Unknown(0.5, 0.9)},
        origins={"lifetime": Origin("seen", "purcell1946", "table 1")},
        correlation={"resonance_wavelength|mode_volume": -0.4},
        name="harbour office",
        note="two lines\nand a tab\t",
        decision=Decision("the meeting", "cheapest", "width of the line"),
        data={"spectrum.csv": "0" * 64},
    )


def test_equal_designs_are_one_key() -> None:
    assert made() == made()
    assert hash(made()) == hash(made())
    assert len({made(), made(), made().with_values(lifetime=4e-9)}) == 2
    assert pickle.loads(pickle.dumps(made())) == made()
    assert copy.deepcopy(made()) == made()


def test_a_design_cannot_be_changed() -> None:
    design = made()
    with pytest.raises(FrozenInstanceError):
        design.name = "other"
    with pytest.raises(TypeError):
        design.point["lifetime"] = 1.0
    point = {"lifetime": 3e-9}
    design = Design(point)
    point["lifetime"] = 5e-9
    assert design.point["lifetime"] == 3e-9


def test_given_values_win_and_defaults_follow() -> None:
    design = Design({"emission_wavelength": 800e-9})
    assert evaluate(design.point, ["resonance_wavelength"])["resonance_wavelength"] == 800e-9
    moved = design.with_values(resonance_wavelength=810e-9)
    assert moved.point["resonance_wavelength"] == 810e-9
    assert moved.origin("resonance_wavelength") == Origin("typed")
    back = moved.without_values("resonance_wavelength")
    assert back == design
    assert back.origin("resonance_wavelength") == Origin("default")


def test_changes_leave_the_rest_alone() -> None:
    changed = made().with_values(lifetime=4e-9)
    assert changed.origin("lifetime") == Origin("typed")
    assert replace(changed, point=made().point, origins=made().origins) == made()
    assert made().with_values() == made()


def test_outcome_and_cautions_are_the_evaluation() -> None:
    design = made()
    assert design.outcome() == evaluate(design.point, QUANTITIES)
    assert design.outcome(["g2_zero"]) == evaluate(design.point, ["g2_zero"])
    marks = evaluate(design.point, CAUTIONS)
    assert design.cautions() == tuple(name for name in CAUTIONS if marks[name])


def test_numbers_of_any_kind_become_floats() -> None:
    design = Design(
        {"quality_factor": 100, "mode_volume": np.float32(0.5), "lifetime": np.array(2e-9)}
    )
    assert all(type(value) is float for value in design.point.values())
    assert design == Design({"quality_factor": 100.0, "mode_volume": 0.5, "lifetime": 2e-9})


@pytest.mark.parametrize("kind", [np.float32, np.float64, np.int64, np.uint8, np.longdouble, int])
def test_scalars_of_numpy_are_numbers(kind: type) -> None:
    numbers = [
        Requirement("g2_zero", at_most=kind(1)).limit,
        Spread("normal", kind(1)).width,
        Unknown(kind(1), 2.0).low,
    ]
    assert numbers == [1.0] * 3
    assert {type(number) for number in numbers} == {float}
    assert Requirement("g2_zero", at_most=np.float32(0.1)).limit == float(np.float32(0.1))


@pytest.mark.parametrize("value", [0.1, 0.1 - 1e-15, -5, math.inf, -math.inf])
def test_requirements(value: float) -> None:
    most, least = Requirement("g2_zero", at_most=0.1), Requirement("g2_zero", at_least=0.1)
    assert most.met(value) == (value <= 0.1)
    assert least.met(value) == (value >= 0.1)
    assert (most.limit, most.sense) == (0.1, "≤")
    assert (least.limit, least.sense) == (0.1, "≥")


def test_no_number_meets_no_requirement() -> None:
    for requirement in (Requirement("g2_zero", at_most=0.1), Requirement("g2_zero", at_least=-1.0)):
        assert not requirement.met(math.nan)
        assert list(requirement.met(np.array([math.nan, 0.05]))) == [False, requirement.met(0.05)]


@pytest.mark.parametrize("name", [name for name in QUANTITIES if QUANTITIES[name].kind == "number"])
def test_any_number_can_be_required(name: str) -> None:
    assert Requirement(name, at_least=0).limit == 0.0


def test_kinds_of_scatter_and_origins() -> None:
    assert [Spread(kind, 0.5).kind for kind in SPREADS] == list(SPREADS)
    assert [Origin(kind).kind for kind in ORIGINS] == list(ORIGINS)
    assert Spread("direction").width == 0
    assert Unknown(1, 1) == Unknown(1.0, 1.0)


def test_an_unknown_range_is_checked_with_the_rest_of_the_point() -> None:
    wide = Unknown(0.5, 1.3)
    Design({"medium_index": 1.5, "reference_side": "glass"}, unknowns={"numerical_aperture": wide})
    with pytest.raises(InputError, match="numerical_aperture"):
        Design(unknowns={"numerical_aperture": wide})


def test_longest_texts_are_allowed() -> None:
    text = "ü" * LONGEST_TEXT
    assert Design(name=text, note=text).note == text


def test_frozen_mapping() -> None:
    one = Frozen({"a": 1.0, "b": 2.0})
    assert one == {"b": 2.0, "a": 1.0}
    assert hash(one) == hash(Frozen({"b": 2.0, "a": 1.0}))
    assert list(one) == ["a", "b"]
    assert one | {"a": 3.0} == {"a": 3.0, "b": 2.0}
    assert pickle.loads(pickle.dumps(one)) == one
    assert one != 5


@pytest.mark.parametrize(
    ("name", "value", "text"),
    [
        ("lifetime", 3e-9, "3 ns"),
        ("filter_width", math.inf, "∞"),
        ("mode_profile", "standing_wave", "standing wave"),
        ("quality_factor", 1e10, "10000000000"),
        ("fast_linewidth", 0.1e-12, "0.0001 nm"),
    ],
)
def test_values_as_written(name: str, value: object, text: str) -> None:
    assert written(name, value) == text
