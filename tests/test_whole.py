"""Whole values: immutable, hashable, compared by content (what they refuse: test_bad_input)."""

from __future__ import annotations

import pickle
from copy import deepcopy
from typing import Any

import numpy as np
import pytest

from explorer import InputError, Lines, Pattern, Samples, evaluate
from explorer.whole import MOST_SAMPLES

MADE: dict[str, Any] = {
    "lines": lambda: Lines([(0.6, 0.0, 2e-9), (0.3, 1e-8, 0.0)]),
    "samples": lambda: Samples([-1e-9, 0.0, 2e-9], [0, 5, 1]),
    "pattern": lambda: Pattern([0.0, 0.4, 1.0], [1.0, 0.5, 0.0]),
}


@pytest.mark.parametrize("kind", MADE)
def test_equal_by_content_and_usable_as_a_key(kind: str) -> None:
    one, other = MADE[kind](), MADE[kind]()
    assert one == other
    assert one is not other
    assert hash(one) == hash(other)
    assert {one: 1}[other] == 1
    assert all(one != MADE[name]() for name in MADE if name != kind)
    assert one != "a text"


@pytest.mark.parametrize("kind", MADE)
def test_nothing_about_it_can_be_changed(kind: str) -> None:
    one = MADE[kind]()
    with pytest.raises(AttributeError):
        one.anything = 1
    for name in ("lines", "offsets", "counts", "angles", "powers"):
        if hasattr(one, name):
            with pytest.raises((AttributeError, TypeError)):
                setattr(one, name, ())
            with pytest.raises((TypeError, ValueError)):
                getattr(one, name)[0] = 5.0


@pytest.mark.parametrize("kind", MADE)
def test_copies_and_travels_between_processes(kind: str) -> None:
    one = MADE[kind]()
    assert pickle.loads(pickle.dumps(one)) == one
    assert hash(pickle.loads(pickle.dumps(one))) == hash(one)
    assert deepcopy(one) == one


def test_it_keeps_no_hold_of_the_arrays_it_was_made_of() -> None:
    offsets, counts = np.array([0.0, 1e-9]), np.array([1.0, 2.0])
    made = Samples(offsets, counts)
    before = hash(made)
    counts[0] = 99
    offsets[0] = -5e-9
    assert made.counts[0] == 1
    assert made.offsets[0] == 0
    assert hash(made) == before


def test_order_does_not_matter() -> None:
    assert Samples([2e-9, -1e-9, 0.0], [1, 0, 5]) == MADE["samples"]()
    assert Pattern([1.0, 0.0, 0.4], [0.0, 1.0, 0.5]) == MADE["pattern"]()
    shuffled = Lines([(0.3, 1e-8, 0.0), (0.6, 0.0, 2e-9)])
    ours = evaluate({"spectrum": MADE["lines"]()}, ["spectral_overlap"])
    theirs = evaluate({"spectrum": shuffled}, ["spectral_overlap"])
    assert ours["spectral_overlap"] == pytest.approx(theirs["spectral_overlap"], rel=1e-14)


def test_any_sequence_of_numbers_will_do() -> None:
    assert Samples((-1e-9, 0, 2e-9), np.array([0, 5, 1])) == MADE["samples"]()
    assert Samples(iter([-1e-9, 0, 2e-9]), (n for n in (0, 5, 1))) == MADE["samples"]()
    assert Lines(np.array([[0.6, 0.0, 2e-9], [0.3, 1e-8, 0.0]])) == MADE["lines"]()


def test_scale_of_counts_does_not_matter() -> None:
    point = {"filter_width": 2e-9, "quality_factor": 1e3}
    wanted = ["spectral_overlap", "filter_share", "other_filter_share"]
    once = evaluate({**point, "spectrum": Samples([-5e-9, 0, 6e-9], [0, 1, 0.3])}, wanted)
    many = evaluate({**point, "spectrum": Samples([-5e-9, 0, 6e-9], [0, 1e7, 0.3e7])}, wanted)
    for name in wanted:
        assert once[name] == pytest.approx(many[name], rel=1e-12)


def test_shares_and_strongest_line() -> None:
    lines = Lines([(0.2, 0.0, 1e-9), (0.5, 1e-8, 2e-9)])
    assert lines.known_share == pytest.approx(0.7)
    assert lines.strongest == 1  # the index of its line
    assert Lines([(1 + 1e-10, 0, 0)]).known_share == 1


def test_a_single_line_is_the_plain_inputs() -> None:
    point = {"quality_factor": 300.0, "mode_volume": 0.02, "filter_width": 30e-9}
    wanted = ["spectral_overlap", "cavity_share", "device_lifetime", "other_filter_share"]
    plain = evaluate({**point, "fast_linewidth": 7e-9}, wanted)
    given = evaluate({**point, "spectrum": Lines([(1.0, 0.0, 7e-9)])}, wanted)
    for name in wanted:
        assert given[name] == pytest.approx(plain[name], rel=1e-12), name


def test_the_most_samples_are_allowed() -> None:
    assert len(Samples(np.arange(MOST_SAMPLES) * 1e-13, np.ones(MOST_SAMPLES))) == MOST_SAMPLES


def test_it_says_what_it_is() -> None:
    assert repr(MADE["samples"]()) == "Samples(3 samples, -1e-09 … 2e-09)"
    assert repr(MADE["pattern"]()) == "Pattern(3 samples, 0 … 1)"
    assert "0.6" in repr(MADE["lines"]())


def test_a_whole_value_is_never_an_axis() -> None:
    with pytest.raises(InputError, match="spectrum"):
        evaluate({"spectrum": [MADE["lines"](), MADE["lines"]()]}, ["cavity_share"])
