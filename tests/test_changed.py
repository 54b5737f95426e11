"""An evaluation that some entries of are changed equals one made afresh."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from explorer import CAUTIONS, QUANTITIES, InputError, evaluate
from explorer.evaluate import Evaluation

from .strategies import Point, points


def assert_changed_equals_fresh(old: Point, new: Point, dropped: list[str]) -> None:
    work = Evaluation(old)
    for name in QUANTITIES:
        work.result(name)
    target = {name: value for name, value in old.items() if name not in dropped} | new
    try:
        fresh = Evaluation(target)
    except InputError:
        with pytest.raises(InputError):
            work.changed(new, dropped)
        return
    changed = work.changed(new, dropped)
    assert changed.given == fresh.given
    assert changed.shape == fresh.shape
    for name in (*QUANTITIES, *CAUTIONS):
        one, other = changed.result(name), fresh.result(name)
        assert np.array_equal(one, other, equal_nan=np.asarray(other).dtype.kind == "f"), name


@given(points(), points(), st.data())
def test_what_is_kept_is_what_would_be_worked_out_again(old: Point, new: Point, data) -> None:
    names = data.draw(st.sets(st.sampled_from(sorted(new)))) if new else set()
    dropped = data.draw(st.sets(st.sampled_from(sorted(old)))) if old else set()
    assert_changed_equals_fresh(old, {name: new[name] for name in names}, sorted(dropped))


def test_a_limit_that_moved_is_checked_again() -> None:
    work = Evaluation({"numerical_aperture": 1.3, "medium_index": 1.52})
    with pytest.raises(InputError, match="numerical_aperture"):
        work.changed({}, ["medium_index"])


def test_arrays_may_come_and_go() -> None:
    work = Evaluation({"quality_factor": np.array([10.0, 100.0])})
    work.result("peak_purcell")
    single = work.changed({"quality_factor": 50.0})
    assert single.shape == ()
    assert (
        single.result("peak_purcell")
        == evaluate({"quality_factor": 50.0}, ["peak_purcell"])["peak_purcell"]
    )
