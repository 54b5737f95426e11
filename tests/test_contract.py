"""General promises, each tested once over every quantity, caution and input.

Finite, documented, sourced; an array gives what its elements give; no number exactly where a caution
says so; shares and budgets add up; monotonic where physics says so.
"""

from __future__ import annotations

import itertools
import math
import subprocess
import sys
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.typing import NDArray

import explorer
from explorer import CAUTIONS, INPUTS, QUANTITIES, Lines, Pattern, Samples, evaluate, units
from explorer.budget import budget_rows
from explorer.catalogue import references
from explorer.evaluate import Evaluation, voiding
from explorer.registry import dependencies, formula_parameters

from .strategies import Point, element, fractions, points, tried, value_at

NUMBERS = [name for name, quantity in QUANTITIES.items() if quantity.kind == "number"]
EVERYTHING = [*QUANTITIES, *CAUTIONS]
VOIDS = [name for name, caution in CAUTIONS.items() if caution.voids]

#: Array against its elements, relative.
SAME = 1e-9

#: A fibre far off the image takes what is left of an oscillating integral, and a filter in the far
#: tail of a measured spectrum that wanders takes what is left of an average, whose nodes follow the
#: array: there rounding is relative to the whole (1), not to the rest. These quantities add this much
#: of what they are a share of.
CANCELLED = 1e-13
THROUGH_FIBRE = {
    "fibre_share": "",
    "other_fibre_share": "",
    "rate_in_fibre": "rate_at_lens",
    "rate_detected": "rate_at_lens",
}
THROUGH_FILTER = {
    "filter_share": "",
    "rate_in_fibre": "rate_at_lens",
    "rate_detected": "rate_at_lens",
}


#: Known and not mended: the nodes of a measured spectrum that is far narrower than it wanders do not
#: follow a filter, so the light inside it is right to this much of the whole only.
NARROW_SPECTRUM = 1e-2


def left_over(point: Point) -> float:
    """What quantities that are left of something cancelled may be off by, of the whole."""
    spectrum = point.get("spectrum")
    if isinstance(spectrum, Samples) and "filter_width" in point:
        wandering = float(np.max(point.get("slow_linewidth", 0.0)))
        if np.ptp(spectrum.offsets) < wandering / 100:
            return NARROW_SPECTRUM
    return CANCELLED


def cancelled(point: Point) -> dict[str, str]:
    """The quantities of a point that are left of something cancelled, and their whole."""
    found = dict(THROUGH_FIBRE) if "fibre_offset" in point else {}
    wanders = np.any(np.asarray(point.get("slow_linewidth", 0.0)) > 0)
    if wanders and isinstance(point.get("spectrum"), Samples):
        found |= THROUGH_FILTER
    return found


# --- what every name carries ---------------------------------------------------------------------


@pytest.mark.parametrize("name", QUANTITIES)
def test_a_quantity_is_documented_sourced_and_has_a_known_unit(name: str) -> None:
    quantity = QUANTITIES[name]
    assert quantity.name == name
    assert len(quantity.doc) > 20
    assert quantity.source == "definition" or quantity.source in references()
    assert units.unit_name(quantity.unit) == units.si_unit(quantity.unit), "values inside are SI"
    assert quantity.group
    assert quantity.kind in ("number", "choice", "mask")
    assert bool(quantity.choices) == (quantity.kind == "choice")


@pytest.mark.parametrize("name", CAUTIONS)
def test_a_caution_is_a_sentence_about_something(name: str) -> None:
    caution = CAUTIONS[name]
    assert caution.doc
    assert caution.sentence[0].isupper()
    assert caution.sentence.endswith(".")
    assert "\n" not in caution.sentence
    assert caution.about
    assert set(caution.about) <= {*QUANTITIES, *INPUTS}


@pytest.mark.parametrize("name", INPUTS)
def test_an_input_has_meaning_unit_domain_slider_and_scale(name: str) -> None:
    entry = INPUTS[name]
    assert entry.meaning.endswith(".")
    assert units.si_unit(entry.shown) == units.si_unit(entry.unit)
    assert units.unit_name(entry.unit) == units.si_unit(entry.unit)
    if entry.whole:
        assert entry.scale == "choice"
        return
    assert entry.scale in ("linear", "log", "log or zero", "log or none")
    low, high = entry.slider
    assert low < high
    assert low > 0 or not entry.scale.startswith("log")
    assert entry.typical
    for end in entry.slider:
        # At the slider's ends the point is valid, where the rest of the point allows it.
        rest = {"medium_index": 2.0} if name == "numerical_aperture" else {}
        rest |= (
            {"emission_wavelength": 2e-6}
            if entry.unit == "m" and name != "emission_wavelength"
            else {}
        )
        evaluate({**rest, name: end}, ["rate_detected"])


@pytest.mark.parametrize(
    "table", [QUANTITIES, CAUTIONS, INPUTS], ids=["quantities", "cautions", "inputs"]
)
def test_labels_are_unique(table: dict[str, Any]) -> None:
    labels = [entry.label for entry in table.values()]
    assert len(set(labels)) == len(labels)


def test_names_of_inputs_quantities_and_cautions_are_apart() -> None:
    names = [*INPUTS, *QUANTITIES, *CAUTIONS]
    assert len(set(names)) == len(names)


def test_every_input_matters_to_some_quantity() -> None:
    needed = set().union(*(dependencies(name) for name in EVERYTHING))
    assert set(INPUTS) <= needed


def test_every_quantity_is_finite_at_the_defaults() -> None:
    found = evaluate({}, EVERYTHING)
    for name in NUMBERS:
        assert isinstance(found[name], float), name
        assert math.isfinite(found[name]), name
    for name in CAUTIONS:
        assert isinstance(found[name], bool), name
    assert found["regime"] in QUANTITIES["regime"].choices


def test_importing_loads_no_widgets_and_no_pandas() -> None:
    heavy = ("ipywidgets", "bqplot", "anywidget", "pandas", "traitlets", "voila", "tornado")
    code = f"import sys, explorer; print([name for name in {heavy} if name in sys.modules])"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


# --- arrays give what their elements give --------------------------------------------------------


def check_numbers(point: Point, found: dict[str, Any]) -> None:
    """Of one design: no number exactly where a caution marked so is true, else a finite one."""
    for name in NUMBERS:
        void = any(found[caution] for caution in voiding(name))
        assert math.isnan(found[name]) == void, (name, found[name], point)
        assert void or math.isfinite(found[name]), (name, found[name], point)
    assert (found["regime"] == "") == any(found[caution] for caution in voiding("regime"))


def check_elements(point: Point) -> float:
    """Every element of an array point gives what it gives alone. Returns the largest deviation."""
    shape = np.broadcast_shapes(*(np.shape(v) for k, v in point.items() if not INPUTS[k].whole))
    whole, left = evaluate(point, EVERYTHING), cancelled(point)
    worst = 0.0
    for name, value in whole.items():
        assert np.shape(value) == shape, name
    for index in np.ndindex(shape):
        alone = evaluate(element(point, shape, index), EVERYTHING)
        check_numbers(element(point, shape, index), alone)
        for name in EVERYTHING:
            one, other = np.asarray(whole[name])[index], alone[name]
            if name not in NUMBERS:
                assert one == other, (name, index, point)
            elif not (math.isnan(one) and math.isnan(other)):
                lost = left_over(point) * alone.get(left[name], 1.0) if name in left else 0.0
                beyond = max(abs(one - other) - lost, 0.0)
                assert beyond <= SAME * abs(other), (name, index, one, other, point)
                worst = max(worst, beyond / abs(other) if other else beyond)
    return worst


@tried(40)
@given(points(arrays=True))
def test_an_array_gives_what_its_elements_give(point: Point) -> None:
    check_elements(point)


@pytest.mark.slow
@tried(2500)
@given(points(arrays=True))
def test_an_array_gives_what_its_elements_give_often(point: Point) -> None:
    check_elements(point)


SPECTRA: dict[str, Any] = {
    "one line": None,
    "lines": Lines([(0.5, 0.0, 3e-9), (0.3, 12e-9, 8e-9), (0.1, -4e-9, 0.0)]),
    "samples": Samples([-30e-9, -8e-9, 0.0, 6e-9, 9e-9, 40e-9], [0, 3, 10, 9, 4, 0]),
}
SLOW: dict[str, Any] = {"still": 0.0, "wandering": 4e-9, "some wander": [0.0, 4e-9, 2e-11]}
FILTERS: dict[str, Any] = {
    "open": math.inf,
    "filtered": 7e-9,
    "some filtered": [7e-9, math.inf, 3e-11],
}
CHOICES = (
    {},
    {"mode_profile": "compact", "pumping": "continuous", "destination": "fibre"},
    {"pattern": Pattern([0.0, 0.2, 0.5, 1.2], [1.0, 0.8, 0.1, 0.0]), "destination": "fibre"},
    {"reference_side": "glass", "pumping": "continuous", "biexciton_yield": [0.0, 0.3, 1.0]},
    {"numerical_aperture": [0.8, 1.2, 1.7], "medium_index": 2.0, "biexciton_yield": 0.1},
)


VARIANTS = list(itertools.product(SPECTRA, SLOW, FILTERS))


def check_variant(spectrum: str, slow: str, window: str, choice: Point) -> None:
    point: Point = {
        **choice,
        "slow_linewidth": SLOW[slow],
        "filter_width": FILTERS[window],
        "quality_factor": np.array([[30.0], [2e5]]),
        "mode_volume": np.array([0.3, 1e-4, 50.0]),
        "resonance_wavelength": 652e-9,
    }
    if SPECTRA[spectrum] is not None:
        point["spectrum"] = SPECTRA[spectrum]
    assert check_elements(point) < 1e-12


@pytest.mark.parametrize("number", range(len(VARIANTS)), ids=[" ".join(v) for v in VARIANTS])
def test_every_variant_of_the_formulas_agrees_with_its_elements(number: int) -> None:
    check_variant(*VARIANTS[number], CHOICES[(number + number // 3) % len(CHOICES)])


@pytest.mark.slow
@pytest.mark.parametrize("choice", range(len(CHOICES)))
@pytest.mark.parametrize("number", range(len(VARIANTS)), ids=[" ".join(v) for v in VARIANTS])
def test_every_variant_of_the_formulas_with_every_choice(number: int, choice: int) -> None:
    check_variant(*VARIANTS[number], CHOICES[choice])


def test_the_shape_of_the_answer_is_the_broadcast_of_the_numbers() -> None:
    point = {
        "quality_factor": np.geomspace(10, 1e6, 3)[:, None],
        "mode_volume": np.geomspace(1e-3, 10, 4),
        "lifetime": np.full((2, 1, 1), 1e-9),
    }
    for value in evaluate(point, [*EVERYTHING, "lifetime", "upward_share"]).values():
        assert value.shape == (2, 3, 4)
        assert not value.flags.writeable


@pytest.mark.parametrize("window", [math.inf, 7e-9])
@pytest.mark.parametrize("slow", [0.0, 4e-9])
@pytest.mark.parametrize("spectrum", SPECTRA)
def test_an_empty_array_gives_empty_arrays(spectrum: str, slow: float, window: float) -> None:
    point: Point = {"slow_linewidth": slow, "filter_width": window}
    if SPECTRA[spectrum] is not None:
        point["spectrum"] = SPECTRA[spectrum]
    for name in (name for name, entry in INPUTS.items() if not entry.whole):
        empty = evaluate({**point, name: np.zeros((0, 3))}, EVERYTHING)
        assert {value.shape for value in empty.values()} == {(0, 3)}, name


def test_of_many_apertures_each_has_its_own_reference_side() -> None:
    """A single design above NA 1 is watched through the glass, one below from the air."""
    wanted = ["brightness_gain", "reference_collected_share"]
    found = evaluate({"medium_index": 1.52, "numerical_aperture": [0.8, 1.2]}, wanted)
    for index, (aperture, side) in enumerate(((0.8, "air"), (1.2, "glass"))):
        point = {"medium_index": 1.52, "numerical_aperture": aperture}
        assert evaluate(point, ["reference_side"])["reference_side"] == side
        alone = evaluate({**point, "reference_side": side}, wanted)
        for name in wanted:
            assert found[name][index] == pytest.approx(alone[name], rel=1e-12), (name, aperture)
    assert found["brightness_gain"][0] == pytest.approx(5.00, abs=0.01)


def test_an_aperture_beyond_the_coverslip_costs_the_reference_alone() -> None:
    point = {"medium_index": 2.0, "numerical_aperture": 1.7}
    found = evaluate(point, EVERYTHING)
    without = {name for name in NUMBERS if math.isnan(found[name])}
    assert without == {"brightness_gain", "reference_collected_share"}
    assert found["beyond_coverslip"]
    assert found["rate_in_fibre"] > 0


NARROW, WIDE = 1e-16, 1e-9  # [m]; 20 ns allow 1.1e-14


@pytest.mark.parametrize(
    ("point", "below", "dephasing"),
    [
        ({"fast_linewidth": NARROW}, True, 0.0),
        ({"fast_linewidth": WIDE}, False, 1.0),
        ({"fast_linewidth": NARROW, "spectrum": Lines([(1.0, 0.0, WIDE)])}, False, 1.0),
        ({"fast_linewidth": WIDE, "spectrum": Lines([(1.0, 0.0, NARROW)])}, True, 0.0),
        ({"fast_linewidth": NARROW, "spectrum": Lines([(1.0, 0.0, None)])}, True, 0.0),
        ({"spectrum": Lines([(0.6, 0.0, WIDE), (0.4, 9e-9, NARROW)])}, True, 1.0),
        ({"spectrum": Lines([(1.0, 0.0, 0.0)])}, False, 0.0),
        ({"fast_linewidth": NARROW, "spectrum": Samples([-WIDE, 0, WIDE], [0, 1, 0])}, False, 1.0),
        ({"fast_linewidth": WIDE, "spectrum": Samples([-NARROW, 0, NARROW], [0, 1, 0])}, True, 0.0),
    ],
)
def test_a_spectrum_stands_in_for_the_fast_linewidth(
    point: Point, below: bool, dephasing: float
) -> None:
    found = evaluate(point, ["line_below_limit", "pure_dephasing", *EVERYTHING])
    assert found["line_below_limit"] == below
    full = 2 * math.pi * 299792458 * WIDE / (650e-9) ** 2
    assert found["pure_dephasing"] == pytest.approx(dephasing * (full - 1 / 20e-9), rel=1e-5)
    parts = found["decay_elsewhere"] + found["pure_dephasing"]
    assert found["coherence_decay"] == pytest.approx(parts, rel=1e-12)


def test_asking_for_more_changes_nothing() -> None:
    point = {"quality_factor": [10.0, 1e7], "slow_linewidth": 1e-9, "filter_width": 5e-9}
    together = evaluate(point, EVERYTHING)
    for name in EVERYTHING:
        assert np.array_equal(evaluate(point, [name])[name], together[name]), name


# --- numbers, and where there is none ------------------------------------------------------------


def check_design(point: Point) -> None:
    """One design: numbers, shares, budget, the bound on the effective rate."""
    work = Evaluation(point)
    found = evaluate(point, EVERYTHING)
    check_numbers(point, found)
    for name in NUMBERS:
        assert math.isnan(found[name]) or found[name] >= 0, (name, found[name], point)
    check_budget(work, found)
    if math.isnan(found["cavity_share"]):
        return
    shares = found["cavity_share"] + found["other_share"] + found["lost_share"]
    assert shares == pytest.approx(1, abs=1e-12), point
    effective = found["effective_purcell"] * found["radiative_rate"]
    assert effective <= found["resonator_linewidth"] * (1 + 1e-12), point
    factors = ("cavity_share", "collected_share", "dipole_collected", "filter_share", "placement")
    for name in (*factors, "other_filter_share", "fibre_share", "other_fibre_share"):
        assert found[name] <= 1 + 1e-9, (name, found[name], point)


def check_budget(work: Evaluation, found: dict[str, Any]) -> None:
    """The totals fall, the streams add up to them, and the last is the end rate."""
    rows = budget_rows(work)
    totals = {row.step: row.total for row in rows}
    rates = {
        "inside the aperture": "rate_at_lens",
        "in the fibre": "rate_in_fibre",
        "detected": "rate_detected",
    }
    for step, name in rates.items():
        assert totals[step] == pytest.approx(found[name], rel=1e-12, nan_ok=True)
    assert rows[-1].step == "detected"
    if math.isnan(rows[-1].total):
        return
    for row, after in itertools.pairwise(rows[1:]):
        assert after.total <= row.total * (1 + 1e-9), (after.step, rows)
        assert sum(after.streams.values()) == pytest.approx(after.total, rel=1e-12, abs=1e-300)
        if row.total:
            assert after.factor == after.total / row.total


@tried(120)
@given(points())
def test_shares_budget_and_numbers_of_a_design(point: Point) -> None:
    check_design(point)


@pytest.mark.slow
@tried(8000)
@given(points())
def test_shares_budget_and_numbers_of_a_design_often(point: Point) -> None:
    check_design(point)


#: A caution that leaves no number: a point of two cells, the first ordinary.
VOID_POINTS: dict[str, Point] = {
    "coupling_beyond_model": {
        "mode_volume": [1.0, 1e-8],
        "lifetime": 1e-12,
        "bulk_rate_ratio": 900.0,
    },
    "no_decay": {"quantum_yield": 1.0, "other_modes": [1.0, 0.0], "dipole_alignment": 0.0},
    "no_biexciton_decay": {
        "biexciton_yield": 1.0,
        "other_modes": [1.0, 0.0],
        "dipole_alignment": 0.0,
    },
    "beyond_coverslip": {"numerical_aperture": [1.2, 1.7], "medium_index": 2.0},
    "no_light": {"biexciton_yield": 0.5, "other_modes": [1.0, 0.0], "dipole_alignment": 0.0},
}


@pytest.mark.parametrize("pumping", ["pulsed", "continuous"])
@pytest.mark.parametrize("mark", VOIDS)
def test_no_number_exactly_where_a_caution_says_so(mark: str, pumping: str) -> None:
    point = VOID_POINTS[mark] | {"pumping": pumping}
    found = evaluate(point, EVERYTHING)
    assert list(found[mark]) == [False, True]
    check_elements(point)
    without = {quantity for quantity in NUMBERS if math.isnan(found[quantity][1])}
    assert not any(math.isnan(found[quantity][0]) for quantity in NUMBERS)
    assert {name for name in NUMBERS if set(CAUTIONS[mark].voids) & dependencies(name)} <= without
    assert ("brightness_gain" if mark == "beyond_coverslip" else "g2_zero") in without
    assert not without & {
        "peak_purcell",
        "mode_radius",
        "collected_share",
        "half_angle",
        "placement",
    }
    rows = budget_rows(Evaluation(element(point, (2,), (1,))))
    assert math.isnan(rows[-1].total) == ("rate_detected" in without)


def test_a_faint_signal_still_has_a_g2() -> None:
    faint = {"other_modes": 0.0, "lateral_offset": 26.5e-6, "aperture_radius": 2e-6}
    found = evaluate(faint, ["rate_detected", "g2_zero", "no_light"])
    assert found["g2_zero"] == 0 or found["no_light"]
    found = evaluate(
        {**faint, "biexciton_yield": 0.5, "lateral_offset": 10.7e-6}, ["rate_detected", "g2_zero"]
    )
    assert 0 < found["rate_detected"] < 1e-200, "its square is below the smallest number"
    assert math.isfinite(found["g2_zero"])


# --- monotonic where physics says so -------------------------------------------------------------

rising_fractions = st.lists(fractions, min_size=2, max_size=6, unique=True).map(sorted)


def along(
    point: Point, name: str, steps: list[float], wanted: str
) -> tuple[NDArray[Any], NDArray[Any]]:
    """A quantity along rising values of one input, the rest of the point fixed."""
    rest = {key: value for key, value in point.items() if key != name}
    values = value_at(INPUTS[name], np.array(steps), rest)
    if wanted == "reference_collected_share" and "reference_side" not in rest:
        values = np.minimum(values, 1.0)
    found = evaluate({**rest, name: values}, [wanted])[wanted]
    return values, np.asarray(found)


def assert_rises(found: NDArray[Any], slack: float, context: Any) -> None:
    found = found[~np.isnan(found)]
    steps = np.diff(found)
    assert np.all(steps >= -slack * np.abs(found[1:])), context


#: (quantity, input, +1 rises or -1 falls, inputs left at their defaults). True for every point.
MONOTONIC = (
    ("collected_share", "numerical_aperture", 1, ()),
    ("dipole_collected", "numerical_aperture", 1, ()),
    ("reference_collected_share", "numerical_aperture", 1, ()),
    ("rate_at_lens", "numerical_aperture", 1, ()),
    ("peak_purcell", "quality_factor", 1, ()),
    ("peak_purcell", "mode_volume", -1, ()),
    ("mode_radius", "mode_volume", 1, ()),
    ("resonator_linewidth", "quality_factor", -1, ()),
    ("placement", "lateral_offset", 0, ()),
    ("half_angle", "aperture_radius", -1, ()),
    ("divergence", "aperture_radius", -1, ()),
    ("collected_share", "aperture_radius", 1, ()),
    ("directivity", "aperture_radius", 1, ()),
    ("filter_share", "filter_width", 1, ()),
    ("other_filter_share", "filter_width", 1, ()),
    ("cavity_share", "dipole_alignment", 1, ()),
    ("cavity_share", "mode_volume", -1, ("lateral_offset", "axial_offset")),
    ("cavity_share", "other_modes", -1, ()),
    ("cavity_share", "quenching", -1, ()),
    ("device_lifetime", "dipole_alignment", -1, ()),
    ("rate_in_fibre", "optics_transmission", 1, ()),
    ("rate_detected", "detector_efficiency", 1, ()),
    ("rate_detected", "bright_share", 1, ()),
    ("rate_detected", "radiative_share", 1, ()),
    ("rate_detected", "upward_share", 1, ()),
    ("rate_detected", "filter_width", 1, ()),
    ("rate_detected", "excitations_per_pulse", 1, ("biexciton_yield",)),
    ("rate_detected", "saturation", 1, ("biexciton_yield", "biexciton_rate_ratio")),
    ("strong_ratio", "fast_linewidth", -1, ()),
)


def check_monotonic(
    row: tuple[str, str, int, tuple[str, ...]], point: Point, steps: list[float]
) -> None:
    wanted, name, sense, default = row
    point = {key: value for key, value in point.items() if key not in default}
    if wanted == "rate_detected" and name == "saturation":
        point["pumping"] = "continuous"
        point["biexciton_rate_ratio"] = (
            1e3  # a biexciton that is gone at once leaves the exciton alone
        )
    if sense == 0:  # falls with the distance, whatever its sign
        steps, sense = [0.5 + step / 2 for step in steps], -1
    _, found = along(point, name, steps, wanted)
    assert_rises(sense * found, 1e-9, (row, found, point))


@pytest.mark.parametrize("row", MONOTONIC, ids=lambda row: f"{row[0]}-{row[1]}")
@tried(12)
@given(point=points(), steps=rising_fractions)
def test_monotonic(row: Any, point: Point, steps: list[float]) -> None:
    check_monotonic(row, point, steps)


@pytest.mark.slow
@pytest.mark.parametrize("row", MONOTONIC, ids=lambda row: f"{row[0]}-{row[1]}")
@tried(400)
@given(point=points(), steps=rising_fractions)
def test_monotonic_often(row: Any, point: Point, steps: list[float]) -> None:
    check_monotonic(row, point, steps)


@tried(40)
@given(points(), st.floats(0.01, 1))
def test_rates_are_proportional_to_what_only_passes_light(point: Point, share: float) -> None:
    full = evaluate({**point, "optics_transmission": 1.0, "detector_efficiency": 1.0}, NUMBERS)
    part = evaluate({**point, "optics_transmission": share, "detector_efficiency": 1.0}, NUMBERS)
    count = evaluate({**point, "optics_transmission": 1.0, "detector_efficiency": share}, NUMBERS)
    for rate in ("rate_in_fibre", "rate_detected"):
        assert part[rate] == pytest.approx(share * full[rate], rel=1e-12, abs=1e-300, nan_ok=True)
    assert count["rate_detected"] == pytest.approx(
        share * full["rate_detected"], rel=1e-12, abs=1e-300, nan_ok=True
    )
    assert count["rate_in_fibre"] == pytest.approx(full["rate_in_fibre"], rel=1e-12, nan_ok=True)
    for name in ("cavity_share", "filter_share", "rate_at_lens", "brightness_gain"):
        assert part[name] == pytest.approx(full[name], rel=1e-12, nan_ok=True)


@tried(40)
@given(points(), rising_fractions)
def test_share_of_the_mode_peaks_at_the_quality_factor_where_exchange_meets_loss(
    point: Point, steps: list[float]
) -> None:
    """One still line on resonance: β rises with Q up to κ = 2g, where 1/R + 1/κ is least."""
    left_out = ("spectrum", "slow_linewidth", "resonance_wavelength")
    point = {key: value for key, value in point.items() if key not in left_out}
    values, found = along(point, "quality_factor", steps, "cavity_share")
    measures = evaluate(
        {**point, "quality_factor": values}, ["resonator_linewidth", "coupling_rate"]
    )
    loss, exchange = (np.broadcast_to(value, values.shape) for value in measures.values())
    assert_rises(found[loss >= 2 * exchange], 1e-12, point)
    assert_rises(-found[loss <= 2 * exchange], 1e-12, point)


@pytest.mark.parametrize("pumping", ["pulsed", "continuous"])
@tried(25)
@given(points(), rising_fractions)
def test_g2_rises_with_the_biexciton_yield_under_weak_pumping(
    pumping: str, point: Point, steps: list[float]
) -> None:
    """Without a filter, weakly pumped, one pulse long after the other: g2 = φB/φX (Nair et al.)."""
    left_out = (
        "filter_width",
        "background_per_pulse",
        "background_rate",
        "spectrum",
        "slow_linewidth",
    )
    point = {key: value for key, value in point.items() if key not in left_out}
    point |= {"pumping": pumping, "excitations_per_pulse": 1e-9, "saturation": 1e-9}
    slowest = evaluate(point, ["device_lifetime"])["device_lifetime"]
    if not math.isfinite(slowest) or slowest > 1e10:
        return
    point["repetition_rate"] = 1e-3 / slowest
    point["quenching"] = min(point.get("quenching", 0.0), 10.0)
    _, found = along(point, "biexciton_yield", steps, "g2_zero")
    assert_rises(found, 1e-9, (found, point))


def test_every_formula_that_depends_on_a_voided_one_is_known_to() -> None:
    """`voiding` follows the wiring: a quantity is void where anything that it needs is."""
    for name in QUANTITIES:
        marks = {mark for mark in VOIDS if dependencies(name) & set(CAUTIONS[mark].voids)}
        assert set(voiding(name)) == marks
        assert all(needed in dependencies(name) for needed in formula_parameters(name))


def test_the_public_names_are_these() -> None:
    promised = {
        "evaluate",
        "INPUTS",
        "QUANTITIES",
        "budget",
        "InputError",
        "Lines",
        "Samples",
        "Pattern",
    }
    promised |= {
        "Design",
        "Requirement",
        "Spread",
        "Unknown",
        "Origin",
        "save_design",
        "load_design",
    }
    assert promised | {"RecordError"} <= set(explorer.__all__)
