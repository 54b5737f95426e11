"""Wrong input of every kind: one clear sentence each, nothing clipped, nothing lost.

Every kind is a row or a parameter here; `KINDS` collects them, and the last test counts them.
"""

from __future__ import annotations

import json
import math
from collections.abc import Callable
from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from explorer import (
    INPUTS,
    Axis,
    Decision,
    Design,
    InputError,
    Lines,
    Origin,
    Pattern,
    RecordError,
    Requirement,
    Samples,
    Spread,
    Unknown,
    WholeError,
    budget,
    design_text,
    evaluate,
    load_design,
    make_map,
    mesh,
    save_design,
    units,
)
from explorer.domain import FARTHEST, shown
from explorer.record import design_from
from explorer.registry import parameters

NUMBERS = [name for name, entry in INPUTS.items() if not entry.whole]
CHOICES = [name for name, entry in INPUTS.items() if entry.choices]
OBJECTS = [name for name, entry in INPUTS.items() if entry.types]

KINDS: set[str] = set()

#: Longest sentence; the refusal of an unknown name also lists the known ones.
LONGEST = 400


def sentence_of(
    call: Callable[[], Any], error: type[Exception], *parts: str, longest: int = LONGEST
) -> str:
    """The message of an error that must come, checked to be one clear sentence that names `parts`."""
    with pytest.raises(error) as caught:
        call()
    assert type(caught.value) is error
    text = str(caught.value)
    assert 10 < len(text) < longest, text
    assert text.isprintable(), "one line, no control characters"
    for jargon in ("Traceback", "object at 0x", "<class", "Error(", "dtype"):
        assert jargon not in text, text
    for part in parts:
        assert part in text, (part, text)
    return text


# --- every input: what is no number ---------------------------------------------------------------

NO_NUMBERS: dict[str, Any] = {
    "text": "a hundred",
    "a number as text": "100",
    "empty text": "",
    "nothing": None,
    "truth value": True,
    "truth value of numpy": np.True_,
    "complex number": 1 + 1j,
    "complex array": np.array([1 + 0j, 2]),
    "bytes": b"100",
    "list of texts": ["1", "2"],
    "list with a gap": [1.0, None],
    "mapping": {"value": 1},
    "set": {1.0},
    "array of objects": np.array([1, "x", None], dtype=object),
    "array of truth values": np.array([True, False]),
    "array of texts": np.array(["1"]),
    "array of times": np.array(["2020-01-01"], dtype="datetime64[D]"),
    "ragged list": [[1.0, 2.0], [3.0]],
    "masked array": np.ma.masked_array([1.0, 2.0], [False, True]),
    "function": math.sin,
    "class": float,
    "generator": (value for value in (1.0, 2.0)),
    "fraction object": Fraction(1, 3),
    "whole value for a number": Lines([(1, 0, 0)]),
    "whole number beyond any float": 10**400,
    "text with line breaks and script": "1\n<script>alert(1)</script>" * 20,
}
KINDS |= {f"number: {kind}" for kind in NO_NUMBERS}


@pytest.mark.parametrize("kind", NO_NUMBERS)
@pytest.mark.parametrize("name", NUMBERS)
def test_what_is_no_number(name: str, kind: str) -> None:
    with pytest.raises(InputError) as caught:
        evaluate({name: NO_NUMBERS[kind]}, [])
    assert caught.value.name == name
    sentence_of(lambda: evaluate({name: NO_NUMBERS[kind]}, ["rate_detected"]), InputError, name)


# --- every input: out of its domain ---------------------------------------------------------------


def domain(name: str) -> tuple[float, float]:
    """Both ends of a domain, SI, the other inputs at their defaults."""
    entry = INPUTS[name]
    low, high = (_end(end) for end in (entry.low, entry.high))
    return max(low, -FARTHEST), min(high, FARTHEST)


def _end(end: Any) -> float:
    if not callable(end):
        return float(end)
    return float(end(**{key: INPUTS[key].default for key in parameters(end)}))


OUTSIDE: dict[str, Callable[[str], float]] = {
    "not-a-number": lambda _: math.nan,
    "minus infinity": lambda _: -math.inf,
    "far below": lambda name: domain(name)[0] - 1.0 - abs(domain(name)[0]),
    "far above": lambda name: 3 * domain(name)[1] + 1.0,
    "just below": lambda name: float(np.nextafter(domain(name)[0], -math.inf)),
    "just above": lambda name: float(np.nextafter(domain(name)[1], math.inf)),
}
KINDS |= {f"domain: {kind}" for kind in OUTSIDE}
KINDS |= {
    "domain: infinity where it is not allowed",
    "domain: at an open low end",
    "domain: at an open high end",
    "domain: smaller than any device",
    "domain: first bad element of an array",
    "domain: bad element of a broadcast array",
}


def assert_refused(name: str, value: Any, number: float, place: str = "") -> None:
    entry = INPUTS[name]
    text = sentence_of(
        lambda: evaluate({name: value}, []), InputError, f"{name}{place} = ", "range"
    )
    if math.isfinite(number):
        written = text.split(" = ")[1].split(" is outside")[0]
        figure = written.removesuffix(f" {entry.shown}")
        assert float(figure) == pytest.approx(
            units.from_si(number, entry.shown), rel=1e-9, abs=1e-300
        )
    if entry.shown != "1":
        assert f" {entry.shown}" in text
    low, high = domain(name)
    assert shown(low, entry) in text, "the allowed range"
    assert shown(high, entry) in text, "the allowed range"
    assert "∞" in text or not entry.infinite


@pytest.mark.parametrize("kind", OUTSIDE)
@pytest.mark.parametrize("name", NUMBERS)
def test_outside_the_domain(name: str, kind: str) -> None:
    value = OUTSIDE[kind](name)
    assert_refused(name, value, value)
    # The same in an array: the first offending element is named.
    good = INPUTS[name].slider[0] if name != "numerical_aperture" else 0.3
    assert_refused(name, [[good, good], [good, value]], value, "[1, 1]")
    assert_refused(name, np.array([good, value, value]), value, "[1]")


@pytest.mark.parametrize("name", NUMBERS)
def test_ends_of_the_domain(name: str) -> None:
    entry = INPUTS[name]
    low, high = domain(name)
    if not entry.infinite:
        assert_refused(name, math.inf, math.inf)
    else:
        assert evaluate({name: math.inf}, [name])[name] == math.inf
    if entry.low_open:
        assert_refused(name, low, low)
        assert_refused(name, -0.0, 0.0) if low == 0 else None
        if low == 0:
            assert_refused(name, 1e-30, 1e-30)
    else:
        assert evaluate({name: low}, [name])[name] == low
    if entry.high_open:
        assert_refused(name, high, high)
    elif name != "numerical_aperture":
        assert evaluate({name: high}, [name])[name] == high


@pytest.mark.parametrize("name", NUMBERS)
def test_nothing_is_clipped(name: str) -> None:
    """What is accepted comes back as it was given, down to the last bit."""
    low, high = domain(name)
    entry = INPUTS[name]
    values = [
        entry.slider[0],
        float(np.nextafter(entry.slider[1], -math.inf)),
        math.sqrt(2) / 3 * high,
    ]
    if entry.high_open or name == "numerical_aperture":
        values[2] = 0.7 * high
    for value in (one for one in values if low < one < high):
        assert evaluate({name: value}, [name])[name] == value
        assert list(evaluate({name: [value, value]}, [name])[name]) == [value, value]


def test_every_entry_is_checked_wanted_or_not() -> None:
    sentence_of(lambda: evaluate({"saturation": -1.0}, ["peak_purcell"]), InputError, "saturation")
    sentence_of(lambda: evaluate({"background_rate": math.nan}, []), InputError, "background_rate")


def test_an_array_of_another_input_does_not_move_the_index() -> None:
    point = {"medium_index": [1.0, 1.5, 2.0], "numerical_aperture": 1.2, "reference_side": "glass"}
    text = sentence_of(
        lambda: evaluate(point, []), InputError, "numerical_aperture = 1.2", "below 1 "
    )
    assert "medium_index" in text
    point = {
        "medium_index": [[1.0], [1.5]],
        "numerical_aperture": [0.9, 1.3],
        "reference_side": "glass",
    }
    sentence_of(lambda: evaluate(point, []), InputError, "numerical_aperture[1] = 1.3", "below 1 ")


# --- joint domains --------------------------------------------------------------------------------

JOINT: dict[str, tuple[dict[str, Any], tuple[str, ...]]] = {
    "aperture above the index of the medium": (
        {"numerical_aperture": 1.3, "medium_index": 1.2},
        ("numerical_aperture = 1.3", "below 1.2", "medium_index"),
    ),
    "aperture at the index of the medium": (
        {"numerical_aperture": 1.0},
        ("numerical_aperture", "medium_index"),
    ),
    "aperture above 1 watched from the air": (
        {"numerical_aperture": 1.2, "medium_index": 1.5, "reference_side": "air"},
        ("numerical_aperture = 1.2", "to 1 ", "reference_side", "air"),
    ),
    "aperture beyond the coverslip": (
        {"numerical_aperture": 1.6, "medium_index": 1.9, "reference_side": "glass"},
        ("numerical_aperture = 1.6", "1.52", "reference_side", "glass"),
    ),
    "fast line broader than the wavelength allows": (
        {"fast_linewidth": 150e-9, "emission_wavelength": 250e-9},
        ("fast_linewidth = 150 nm", "below 150 nm", "emission_wavelength"),
    ),
    "slow line broader than the wavelength allows": (
        {"slow_linewidth": [0.0, 400e-9]},
        ("slow_linewidth[1] = 400 nm", "below 390 nm", "emission_wavelength"),
    ),
    "biexciton shifted by more than half the wavelength": (
        {"biexciton_shift": -330e-9},
        ("biexciton_shift = -330 nm", "from -325 nm to 325 nm", "emission_wavelength"),
    ),
    "line at a negative wavelength": (
        {"spectrum": Lines([(0.5, 0, 1e-9), (0.5, -700e-9, 1e-9)])},
        ("spectrum", "-700 nm", "from -585 nm", "emission_wavelength"),
    ),
    "line broader than its wavelength allows": (
        {"spectrum": Lines([(1.0, 0.0, 400e-9)])},
        ("spectrum", "400 nm", "390 nm", "emission_wavelength"),
    ),
    "samples closer than rounding": (
        {"spectrum": Samples([0.0, 1e-24, 1e-9], [1, 1, 1])},
        ("spectrum", "a spacing of 1e-15 nm", "from 6.5e-12 nm", "emission_wavelength"),
    ),
    "samples in nanometres": (
        {"spectrum": Samples([-30, 0, 30], [0, 1, 0])},
        ("spectrum", "-3e+10 nm", "emission_wavelength"),
    ),
    "samples at wavelengths instead of offsets, far off": (
        {"spectrum": Samples([0, 7e-6], [1, 1])},
        ("spectrum", "7000 nm", "to 5850 nm", "emission_wavelength"),
    ),
    "shapes that do not fit": (
        {"quality_factor": [1e2, 1e3], "mode_volume": [1.0, 2.0, 3.0]},
        ("(3,)", "mode_volume", "(2,)", "quality_factor"),
    ),
    "shapes of three inputs that do not fit": (
        {
            "lifetime": np.full((2, 1), 1e-9),
            "quality_factor": [1e2, 1e3],
            "mode_volume": np.ones((3, 2)),
        },
        ("(3, 2)", "mode_volume", "lifetime, quality_factor"),
    ),
}
KINDS |= {f"joint: {kind}" for kind in JOINT}


@pytest.mark.parametrize("kind", JOINT)
def test_joint_domains(kind: str) -> None:
    point, parts = JOINT[kind]
    sentence_of(lambda: evaluate(point, ["rate_detected"]), InputError, *parts)
    # The order in which a point names its inputs does not matter.
    backwards = dict(reversed(point.items()))
    sentence_of(lambda: evaluate(backwards, []), InputError)


# --- whole values ---------------------------------------------------------------------------------

NO_WORDS: dict[str, Any] = {
    "unknown word": "sideways",
    "another case": "PULSED",
    "number": 1,
    "nothing": None,
    "list of words": ["pulsed", "pulsed"],
    "array of words": np.array(["pulsed", "continuous"]),
    "truth value": False,
    "bytes": b"pulsed",
    "very long text": "pulsed " * 1000,
    "object of another input": Samples([0, 1e-9], [1, 1]),
}
KINDS |= {f"choice: {kind}" for kind in NO_WORDS}


@pytest.mark.parametrize("kind", NO_WORDS)
@pytest.mark.parametrize("name", CHOICES)
def test_wrong_choices(name: str, kind: str) -> None:
    sentence_of(
        lambda: evaluate({name: NO_WORDS[kind]}, []), InputError, name, *INPUTS[name].choices
    )


NO_OBJECTS: dict[str, Any] = {
    "text": "broad",
    "number": 3.0,
    "nothing": None,
    "bare list": [(1.0, 0.0, 1e-9)],
    "array": np.ones((3, 2)),
    "class instead of an object": Lines,
    "mapping": {"lines": []},
}
KINDS |= {f"whole: {kind}" for kind in NO_OBJECTS} | {"whole: of the other kind"}


@pytest.mark.parametrize("kind", NO_OBJECTS)
@pytest.mark.parametrize("name", OBJECTS)
def test_wrong_whole_values(name: str, kind: str) -> None:
    types = [one.__name__ for one in INPUTS[name].types]
    sentence_of(lambda: evaluate({name: NO_OBJECTS[kind]}, []), InputError, name, *types)


def test_whole_values_of_the_other_kind() -> None:
    pattern, samples = Pattern([0, 1], [1, 1]), Samples([0, 1e-9], [1, 1])
    sentence_of(
        lambda: evaluate({"spectrum": pattern}, []), InputError, "spectrum", "Lines or Samples"
    )
    sentence_of(lambda: evaluate({"pattern": samples}, []), InputError, "pattern", "Pattern")


BAD_WHOLES: dict[str, tuple[Callable[[], Any], str]] = {
    "no lines": (lambda: Lines([]), "three numbers"),
    "lines of two numbers": (lambda: Lines([(1, 0)]), "three numbers"),
    "lines that are text": (lambda: Lines([("a", "b", "c")]), "three numbers"),
    "lines that are one number": (lambda: Lines(5), "three numbers"),
    "lines with complex numbers": (lambda: Lines([(1j, 0, 0)]), "three numbers"),
    "line share zero": (lambda: Lines([(0, 0, 0)]), "share"),
    "line share negative": (lambda: Lines([(0.5, 0, 0), (-0.1, 0, 0)]), "line 1"),
    "line shares above 1": (lambda: Lines([(0.7, 0, 0), (0.4, 1e-9, 0)]), "1.1, above 1"),
    "line width negative": (lambda: Lines([(1, 0, -1e-9)]), "width"),
    "line offset not-a-number": (lambda: Lines([(1, math.nan, 0)]), "finite"),
    "line width infinite": (lambda: Lines([(1, 0, math.inf)]), "finite"),
    "too many lines": (lambda: Lines([(0.01, 0, 0)] * 51), "51 lines"),
    "no samples": (lambda: Samples([], []), "at least two"),
    "one sample": (lambda: Samples([0.0], [1.0]), "at least two"),
    "samples of different length": (lambda: Samples([0, 1e-9], [1.0]), "2 and 1"),
    "samples with a table": (lambda: Samples([[0, 1]], [[1, 1]]), "one-dimensional"),
    "samples that are text": (lambda: Samples(["a", "b"], [1, 1]), "list of numbers"),
    "samples that are no list": (lambda: Samples(None, [1, 1]), "list of numbers"),
    "samples not-a-number": (lambda: Samples([0, 1e-9], [1, math.nan]), "counts[1]"),
    "sample offset infinite": (lambda: Samples([0, math.inf], [1, 1]), "offsets[1]"),
    "samples negative": (lambda: Samples([0, 1e-9], [1, -1]), "negative"),
    "samples all zero": (lambda: Samples([0, 1e-9], [0, 0]), "zero"),
    "samples twice at one offset": (lambda: Samples([0, 1e-9, 0], [1, 1, 1]), "twice"),
    "too many samples": (lambda: Samples(range(200_001), np.ones(200_001)), "200001"),
    "no angles": (lambda: Pattern([], []), "at least two"),
    "one angle": (lambda: Pattern([0.0], [1.0]), "at least two"),
    "pattern without extent": (lambda: Pattern([0, 1e-300], [1, 1]), "1e-20 rad"),
    "line share vanishing": (lambda: Lines([(5e-324, 0, 0)]), "share"),
    "angle negative": (lambda: Pattern([-0.1, 1], [1, 1]), "π/2"),
    "angles in degrees": (lambda: Pattern([0, 45], [1, 1]), "π/2"),
    "angle twice": (lambda: Pattern([0, 0, 1], [1, 1, 1]), "twice"),
    "power negative": (lambda: Pattern([0, 1], [1, -1]), "negative"),
    "powers all zero": (lambda: Pattern([0, 1], [0, 0]), "zero"),
    "power complex": (lambda: Pattern([0, 1], [1j, 1]), "list of numbers"),
    "power truth values": (lambda: Pattern([0, 1], [True, True]), "list of numbers"),
}
KINDS |= {f"whole: {kind}" for kind in BAD_WHOLES}


@pytest.mark.parametrize("kind", BAD_WHOLES)
def test_spectra_and_patterns_that_cannot_be(kind: str) -> None:
    call, part = BAD_WHOLES[kind]
    sentence_of(call, WholeError, part)


# --- points, wanted names, maps -------------------------------------------------------------------

POINTS: dict[str, tuple[Callable[[], Any], tuple[str, ...]]] = {
    "a point that is a list": (lambda: evaluate([("lifetime", 1e-9)], []), ("list",)),
    "a point that is nothing": (lambda: evaluate(None, []), ("NoneType",)),
    "a point that is a text": (lambda: evaluate("lifetime", []), ("str",)),
    "a budget of an array": (lambda: budget({"lifetime": [1e-9, 2e-9]}), ("one design",)),
    "a budget of a bad point": (lambda: budget({"lifetime": 0.0}), ("lifetime", "1e-12", "ns")[:1]),
    "a map axis that is no input": (lambda: Axis("q_factor", 1, 2), ("q_factor",)),
    "a map axis that is a whole value": (lambda: Axis("pumping", 1, 2), ("pumping",)),
    "a map axis that runs backwards": (lambda: Axis("quality_factor", 100, 10), ("quality_factor",)),
    "a map axis without end": (lambda: Axis("quality_factor", 1, math.inf), ("quality_factor",)),
    "a map axis of not-a-number": (lambda: Axis("quality_factor", math.nan, 2), ("quality_factor",)),
    "a map axis of truth values": (lambda: Axis("quality_factor", True, 5), ("quality_factor", "rise")),
    "a map axis beyond any float": (lambda: Axis("quality_factor", 1, 10**400), ("quality_factor", "rise")),
    "a map axis of text": (lambda: Axis("quality_factor", "1", 2), ("quality_factor",)),
    "a logarithmic axis from zero": (lambda: Axis("quenching", 0, 2), ("quenching", "above 0")),
    "a map axis of one cell": (lambda: Axis("lifetime", 1e-9, 2e-9, count=1), ("2 to 2048", "1")),
    "a map axis of a million cells": (lambda: Axis("lifetime", 1e-9, 2e-9, count=10**6), ("2048",)),
    "a map axis of half a cell": (lambda: Axis("lifetime", 1e-9, 2e-9, count=2.5), ("2048", "2.5")),
    "a map over one input twice": (
        lambda: mesh(Axis("lifetime", 1e-9, 2e-9), Axis("lifetime", 1e-9, 3e-9)),
        ("two different inputs", "lifetime"),
    ),
    "a map beyond the domain": (
        lambda: make_map({}, Axis("quality_factor", 0.5, 10), Axis("mode_volume", 1, 2), []),
        ("quality_factor", "from 1 to"),
    ),
}  # fmt: skip
KINDS |= {f"point: {kind}" for kind in POINTS}
KINDS |= {
    "point: unknown input",
    "point: input that is no name",
    "point: unknown quantity",
    "point: quantity that is no name",
}


@pytest.mark.parametrize("kind", POINTS)
def test_points_and_maps_that_cannot_be(kind: str) -> None:
    call, parts = POINTS[kind]
    sentence_of(call, InputError, *parts)


@pytest.mark.parametrize("name", ["q_factor", "Lifetime", "", 5, None, ("lifetime",), "x\ny" * 200])
def test_unknown_inputs_list_the_known_ones(name: Any) -> None:
    sentence_of(lambda: evaluate({name: 1.0}, []), InputError, "is no input", *INPUTS, longest=1200)


@pytest.mark.parametrize(
    "name", ["brightness", "", 5, None, ("g2_zero",), ["g2_zero"], "x\n" * 300]
)
def test_unknown_quantities_list_the_known_ones(name: Any) -> None:
    with pytest.raises(KeyError) as caught:
        evaluate({}, ["g2_zero", name])
    text = str(caught.value.args[0])
    assert "is no quantity" in text
    assert "rate_in_fibre" in text
    assert text.isprintable()


# --- designs --------------------------------------------------------------------------------------

Q = {"quality_factor": 100.0}
DESIGNS: dict[str, tuple[Callable[[], Any], tuple[str, ...]]] = {
    "requirement on an unknown quantity": (lambda: Requirement("speed", at_least=1), ("speed",)),
    "requirement on an input": (lambda: Requirement("lifetime", at_least=1), ("lifetime",)),
    "requirement on a choice": (lambda: Requirement("regime", at_least=1), ("regime",)),
    "requirement on what is no name": (lambda: Requirement(["g2_zero"], at_most=1), ("g2_zero",)),
    "requirement without a value": (lambda: Requirement("g2_zero"), ("g2_zero", "at_least or at_most")),
    "requirement of two values": (lambda: Requirement("g2_zero", 0.1, 0.2), ("at_least or at_most",)),
    "requirement of text": (lambda: Requirement("g2_zero", at_most="0.1"), ("at_most", "'0.1'")),
    "requirement of a truth value": (lambda: Requirement("g2_zero", at_most=True), ("True",)),
    "requirement of not-a-number": (lambda: Requirement("g2_zero", at_most=math.nan), ("finite",)),
    "requirement beyond any float": (lambda: Requirement("g2_zero", at_most=10**400), ("finite",)),
    "requirement of a truth value of numpy": (lambda: Requirement("g2_zero", at_most=np.True_), ("at_most",)),
    "requirement without end": (lambda: Requirement("g2_zero", at_least=math.inf), ("finite",)),
    "requirement of an array": (lambda: Requirement("g2_zero", at_most=np.ones(2)), ("at_most",)),
    "scatter of an unknown kind": (lambda: Spread("cauchy", 1.0), ("cauchy", "normal")),
    "scatter of what is no kind": (lambda: Spread(["normal"], 1.0), ("normal",)),
    "scatter negative": (lambda: Spread("normal", -1.0), ("-1",)),
    "scatter of text": (lambda: Spread("normal", "wide"), ("wide",)),
    "scatter without end": (lambda: Spread("normal", math.inf), ("finite",)),
    "range backwards": (lambda: Unknown(2.0, 1.0), ("2", "1")),
    "range of not-a-number": (lambda: Unknown(math.nan, 1.0), ("low end",)),
    "range without end": (lambda: Unknown(0.0, math.inf), ("high end",)),
    "range of nothing": (lambda: Unknown(None, 1.0), ("None",)),
    "origin unknown": (lambda: Origin("guessed"), ("guessed", "from memory")),
    "origin that is no word": (lambda: Origin(["seen"]), ("seen",)),
    "origin with a number as source": (lambda: Origin("seen", 5), ("source",)),
    "design of arrays": (lambda: Design({"quality_factor": [1.0, 2.0]}), ("one point",)),
    "design of an unknown input": (lambda: Design({"q": 1.0}), ("'q'",)),
    "scatter of an unknown input": (lambda: Design(Q, scatter={"q": Spread("normal", 1)}), ("'q'",)),
    "scatter of a whole value": (lambda: Design(Q, scatter={"pumping": Spread("normal", 1)}), ("pumping",)),
    "scatter that is a number": (lambda: Design(Q, scatter={"lifetime": 0.1}), ("lifetime", "Spread")),
    "range outside the domain": (lambda: Design(unknowns={"quantum_yield": Unknown(0.5, 2)}), ("quantum_yield = 2",)),
    "range that meets another input": (
        lambda: Design({"medium_index": 1.0}, unknowns={"numerical_aperture": Unknown(0.5, 1.2)}),
        ("numerical_aperture = 1.2", "medium_index"),
    ),
    "range that is a pair": (lambda: Design(unknowns={"lifetime": (1e-9, 2e-9)}), ("lifetime", "Unknown")),
    "origin that is a text": (lambda: Design(origins={"lifetime": "seen"}), ("lifetime", "Origin")),
    "requirements that are texts": (lambda: Design(requirements=("g2 < 0.1",)), ("g2 < 0.1",)),
    "requirements that are one": (lambda: Design(requirements=Requirement("g2_zero", at_most=0.1)), ("requirements",)),
    "scatter that is a list": (lambda: Design(scatter=[("lifetime", 1)]), ("scatter",)),
    "correlation of one input": (lambda: Design(correlation={"lifetime": 0.5}), ("lifetime",)),
    "correlation with itself": (lambda: Design(correlation={"lifetime|lifetime": 0.5}), ("lifetime",)),
    "correlation of an unknown input": (lambda: Design(correlation={"lifetime|q": 0.5}), ("q",)),
    "correlation above 1": (lambda: Design(correlation={"lifetime|quality_factor": 1.5}), ("1.5", "-1 to 1")),
    "correlation of text": (lambda: Design(correlation={"lifetime|quality_factor": "1"}), ("'1'",)),
    "name that is a number": (lambda: Design(name=5), ("name",)),
    "note beyond 4000 signs": (lambda: Design(note="x" * 4001), ("4000",)),
    "note with a control character": (lambda: Design(note="a\x00b"), ("control",)),
    "note with half a sign": (lambda: Design(note="a\ud800b"), ("sign",)),
    "decision that is a text": (lambda: Design(decision="we"), ("decision",)),
    "decision by a number": (lambda: Design(decision=Decision(who=7)), ("decision",)),
    "record key that is a number": (lambda: Design(emitter=7), ("emitter",)),
    "data that is a number": (lambda: Design(data={"a.csv": 7}), ("data",)),
    "with an unknown value": (lambda: Design().with_values(q=1.0), ("'q'",)),
    "with a bad value": (lambda: Design().with_values(lifetime=-1.0), ("lifetime", "ns")),
    "saving a bad point": (lambda: design_text({"lifetime": -1.0}), ("lifetime", "ns")),
    "saving a map": (lambda: design_text({"lifetime": [1e-9, 2e-9]}), ("one point",)),
}  # fmt: skip
KINDS |= {f"design: {kind}" for kind in DESIGNS}


@pytest.mark.parametrize("kind", DESIGNS)
def test_designs_that_cannot_be(kind: str) -> None:
    call, parts = DESIGNS[kind]
    sentence_of(
        call,
        InputError,
        *parts,
        longest=1200 if "unknown input" in kind or "unknown value" in kind else LONGEST,
    )


# --- records --------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def good() -> str:
    design = Design(
        {
            "lifetime": 3e-9,
            "pumping": "pulsed",
            "spectrum": Lines([(0.6, 0, 2e-9), (0.3, 9e-9, 1e-9)]),
        },
        requirements=(Requirement("g2_zero", at_most=0.1),),
        scatter={"resonance_wavelength": Spread("normal", 1e-9)},
        unknowns={"quantum_yield": Unknown(0.5, 0.9)},
        origins={"lifetime": Origin("typed")},
        correlation={"resonance_wavelength|mode_volume": 0.3},
        name="harbour to lighthouse",
    )
    return design_text(design)


def put(path: str, value: Any) -> Callable[[str], bytes]:
    """A change of one value of a record, found by its path."""

    def change(text: str) -> bytes:
        record = json.loads(text)
        *steps, last = path.split("/")
        place = record
        for step in steps:
            place = place[int(step) if isinstance(place, list) else step]
        place[last] = value
        return json.dumps(record).encode()

    return change


def drop(path: str) -> Callable[[str], bytes]:
    """A record without one of its parts."""

    def change(text: str) -> bytes:
        record = json.loads(text)
        *steps, last = path.split("/")
        place = record
        for step in steps:
            place = place[step]
        del place[last]
        return json.dumps(record).encode()

    return change


def swap(old: str, new: str) -> Callable[[str], bytes]:
    """A change of the text itself."""

    def change(text: str) -> bytes:
        assert old in text
        return text.replace(old, new, 1).encode()

    return change


LIFETIME = "inputs/given/lifetime"
LINES = "inputs/given/spectrum/value"
RECORDS: dict[str, tuple[Callable[[str], bytes], tuple[str, ...]]] = {
    "empty": (lambda _: b"", ("not JSON", "line 1")),
    "spaces": (lambda _: b" \n ", ("not JSON",)),
    "cut off": (lambda text: text[: len(text) // 2].encode(), ("not JSON", "line")),
    "cut off by one sign": (lambda text: text.rstrip()[:-1].encode(), ("not JSON",)),
    "more behind the end": (lambda text: (text + "}").encode(), ("not JSON",)),
    "two records": (lambda text: (text + text).encode(), ("not JSON",)),
    "another language": (lambda _: b"<html><body>hello</body></html>", ("not JSON", "line 1")),
    "a comment": (lambda text: ("// saved\n" + text).encode(), ("not JSON",)),
    "single quotes": (lambda text: text.replace('"', "'").encode(), ("not JSON",)),
    "not UTF-8": (lambda _: b'{"name": "\xff\xfe"}', ("UTF-8", "byte 10")),
    "UTF-16": (lambda text: text.encode("utf-16"), ("UTF-8",)),
    "a picture": (lambda _: b"\x89PNG\r\n\x1a\n" + bytes(range(256)), ("UTF-8",)),
    "zero bytes": (lambda _: b"\x00" * 100, ("not JSON",)),
    "a number": (lambda _: b"42", ("no design record",)),
    "a list": (lambda text: f"[{text}]".encode(), ("no design record",)),
    "null": (lambda _: b"null", ("no design record",)),
    "an empty object": (lambda _: b"{}", ("no design record", "format")),
    "another format": (put("format", "a shopping list"), ("format",)),
    "a later version": (put("version", 2), ("version", "2", "reads version 1")),
    "an earlier version": (put("version", 0), ("version", "0")),
    "a version in words": (put("version", "one"), ("version", "one")),
    "no version": (drop("version"), ("version",)),
    "a part missing": (drop("requirements"), ("requirements",)),
    "inputs missing": (drop("inputs"), ("inputs",)),
    "a unit missing": (drop(f"{LIFETIME}/unit"), ("lifetime", "unit")),
    "a value missing": (drop(f"{LIFETIME}/value"), ("lifetime", "value")),
    "an unknown part": (put("extra", 1), ("extra",)),
    "an unknown input": (put("inputs/given/q_factor", {"value": 1, "unit": "1"}), ("q_factor",)),
    "an unknown unit": (put(f"{LIFETIME}/unit", "parsec"), ("lifetime", "parsec")),
    "a unit of another kind": (put(f"{LIFETIME}/unit", "nm"), ("lifetime", "nm")),
    "a unit that is a number": (put(f"{LIFETIME}/unit", 9), ("lifetime", "9")),
    "units of another table": (put(f"{LINES}/units", ["1", "m", "m"]), ("spectrum",)),
    "a requirement in another unit": (
        put("requirements/0/at_most", {"value": 1, "unit": "nm"}),
        ("g2_zero", "nm"),
    ),
    "a requirement in an unknown unit": (
        put("requirements/0/at_most", {"value": 1, "unit": "furlong"}),
        ("g2_zero", "furlong"),
    ),
    "a number as text": (put(f"{LIFETIME}/value", "3"), ("lifetime", "3")),
    "not-a-number as a word": (put(f"{LIFETIME}/value", "none"), ("lifetime", "not-a-number")),
    "infinity as a word": (put(f"{LIFETIME}/value", "infinite"), ("lifetime", "∞")),
    "null as a number": (put(f"{LIFETIME}/value", None), ("lifetime",)),
    "a truth value as a number": (put(f"{LIFETIME}/value", True), ("lifetime",)),
    "a list as a number": (put(f"{LIFETIME}/value", [3]), ("lifetime",)),
    "a list for an object": (put("inputs", [1, 2]), ("inputs",)),
    "an object for a list": (put("requirements", {"g2_zero": 1}), ("requirements",)),
    "a text for an object": (put("inputs/given", "lifetime = 3 ns"), ("given",)),
    "NaN": (swap('"value": 3,', '"value": NaN,'), ("NaN",)),
    "Infinity": (swap('"value": 3,', '"value": Infinity,'), ("Infinity",)),
    "minus Infinity": (swap('"value": 3,', '"value": -Infinity,'), ("-Infinity",)),
    "a huge exponent": (swap('"value": 3,', '"value": 1e999999,'), ("lifetime", "∞")),
    "a monstrous exponent": (swap('"value": 3,', '"value": 1e999999999,'), ("lifetime",)),
    "an unreadable exponent": (swap('"value": 3,', '"value": 1e99999999999999999999,'), ("number",)),
    "a vanishing exponent": (swap('"value": 3,', '"value": 1e-999999999,'), ("lifetime",)),
    "a million digits": (swap('"value": 3,', f'"value": {"9" * 1_000_000},'), ("lifetime",)),
    "a leading plus": (swap('"value": 3,', '"value": +3,'), ("not JSON",)),
    "a hexadecimal number": (swap('"value": 3,', '"value": 0x3,'), ("not JSON",)),
    "a name twice": (swap('"lifetime":', '"lifetime": {"value": 1, "unit": "ns"}, "lifetime":'), ("lifetime", "twice")),
    "a value outside its domain": (put(f"{LIFETIME}/value", -3), ("lifetime = -3 ns", "from 0.001 ns")),
    "a joint domain": (
        put("inputs/given/numerical_aperture", {"value": 1.2, "unit": "1"}),
        ("numerical_aperture", "medium_index"),
    ),
    "an unknown choice": (put("inputs/given/pumping/value", "sideways"), ("pumping",)),
    "a table of another kind": (put(f"{LINES}/kind", "stripes"), ("spectrum",)),
    "a table without rows": (put(f"{LINES}/rows", []), ("spectrum",)),
    "a ragged table": (put(f"{LINES}/rows", [[0.5, 0, 1], [0.5, 0]]), ("spectrum",)),
    "a table of texts": (put(f"{LINES}/rows", [["a", "b", "c"]]), ("spectrum",)),
    "shares above 1": (put(f"{LINES}/rows", [[0.9, 0, 1], [0.9, 1, 1]]), ("1.8",)),
    "a requirement of two sides": (
        put("requirements/0/at_least", {"value": 0, "unit": "1"}),
        ("requirements",),
    ),
    "a requirement on an unknown quantity": (put("requirements/0/quantity", "speed"), ("speed",)),
    "an unknown kind of scatter": (put("scatter/resonance_wavelength/kind", "cauchy"), ("cauchy",)),
    "a scatter below zero": (
        put("scatter/resonance_wavelength/width/value", -1),
        ("scatter", "negative"),
    ),
    "a scatter in another unit": (put("scatter/resonance_wavelength/width/unit", "ns"), ("resonance_wavelength",)),
    "a range backwards": (put("unknowns/quantum_yield/low/value", 0.95), ("backwards",)),
    "a range outside the domain": (put("unknowns/quantum_yield/high/value", 1.5), ("quantum_yield = 1.5",)),
    "a correlation above 1": (put("correlation/resonance_wavelength|mode_volume", 7), ("7",)),
    "a huge correlation": (swap('"resonance_wavelength|mode_volume": 0.3', '"resonance_wavelength|mode_volume": 1e999999999'), ("resonance_wavelength",)),
    "an unknown origin": (put("origins/lifetime/kind", "dreamt"), ("dreamt",)),
    "a text without end": (put("note", "x" * 5000), ("note",)),
    "a raw control character": (lambda text: text.replace("harbour", "har\x07bour").encode(), ("not JSON", "control")),
    "a written control character": (put("note", "a\x00b"), ("control",)),
    "half a sign": (put("note", "a\ud800b"), ("sign",)),
    "a number for a text": (put("name", 5), ("name",)),
    "nested deeply": (lambda _: b"[" * 100_000 + b"]" * 100_000, ("nested deeper",)),
    "nested deeply in a slot": (put("shown", json.loads('{"a":' * 60 + "1" + "}" * 60)), ("nested deeper",)),
    "nested deeply and cut off": (lambda _: b'{"a":' * 100_000, ("nested deeper",)),
    "50 MB": (lambda _: b" " * 50_000_000, ("50 MB", "20 MB")),
    "19 MB of nothing": (lambda _: b" " * 19_000_000, ("not JSON",)),
    "a million parts": (put("data", {str(i): 1 for i in range(100_000)}), ("data",)),
}  # fmt: skip
KINDS |= {f"record: {kind}" for kind in RECORDS}


@pytest.mark.parametrize("kind", RECORDS)
def test_records_that_cannot_be_read(kind: str, good: str, tmp_path: Path) -> None:
    change, parts = RECORDS[kind]
    content = change(good)
    file = tmp_path / "design.json"
    file.write_bytes(content)
    text = sentence_of(lambda: load_design(file), RecordError, "design.json", *parts)
    assert str(tmp_path) not in text, "the name is enough"
    assert file.read_bytes() == content, "the file stays as it was"
    if len(content) < 20_000_000:
        sentence_of(lambda: design_from(content, "the upload"), RecordError, "the upload", *parts)


PATHS: dict[str, Callable[[Path], Path]] = {
    "a missing file": lambda folder: folder / "design.json",
    "a folder": lambda folder: folder,
    "a file in a missing folder": lambda folder: folder / "nowhere" / "design.json",
    "a link to nothing": lambda folder: _link(folder, "gone.json"),
    "a link to itself": lambda folder: _link(folder, "design.json"),
    "a name with a zero byte": lambda folder: folder / "de\x00sign.json",
    "a name beyond the limit": lambda folder: folder / ("x" * 300),
}
KINDS |= {f"path: {kind}" for kind in PATHS}


def _link(folder: Path, target: str) -> Path:
    link = folder / "design.json"
    link.symlink_to(folder / target)
    return link


@pytest.mark.parametrize("kind", PATHS)
def test_paths_that_cannot_be_read(kind: str, tmp_path: Path) -> None:
    sentence_of(lambda: load_design(PATHS[kind](tmp_path)), RecordError, "cannot be read")


@pytest.mark.parametrize(
    "kind",
    [
        "a folder",
        "a file in a missing folder",
        "a name with a zero byte",
        "a name beyond the limit",
    ],
)
def test_paths_that_cannot_be_written(kind: str, tmp_path: Path) -> None:
    sentence_of(lambda: save_design({}, PATHS[kind](tmp_path)), RecordError, "was not saved")
    assert list(tmp_path.iterdir()) == [], "nothing is left behind"


def test_there_are_many_distinct_kinds() -> None:
    print(f"{len(KINDS)} distinct kinds of wrong input")
    assert len(KINDS) >= 40
