"""Maps: axes, outline of what meets the requirements, binding requirement, iso-lines, frontiers."""

from __future__ import annotations

import math
from itertools import pairwise
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from explorer import INPUTS, Axis, InputError, Requirement, evaluate, make_map, mesh
from explorer.maps import FRONTIERS, isolines, margins

X = Axis("mode_volume", 1e-2, 1e2, count=64)
Y = Axis("quality_factor", 10, 1e5, count=48)


def area(polygon: NDArray[Any]) -> float:
    """Area inside a closed polyline."""
    x, y = polygon[:, 0], polygon[:, 1]
    return abs(float(np.sum(x[:-1] * y[1:] - x[1:] * y[:-1]))) / 2


# --- axes -----------------------------------------------------------------------------------------


@pytest.mark.parametrize("axis", [X, Y, Axis("axial_offset", -1e-7, 3e-7, log=False, count=5)])
def test_an_axis_has_even_cells_and_their_centres(axis: Axis) -> None:
    assert axis.values.shape == (axis.count,)
    centres = (np.arange(axis.count) + 0.5) / axis.count
    assert axis.fraction(axis.values) == pytest.approx(centres, rel=1e-12)
    assert float(axis.at(0.0)) == axis.low
    assert float(axis.at(1.0)) == pytest.approx(axis.high, rel=1e-14)
    steps = np.diff(np.log(axis.values) if axis.log else axis.values)
    assert steps == pytest.approx(np.full(axis.count - 1, steps[0]), rel=1e-9)
    assert float(axis.fraction(axis.low)) == pytest.approx(0, abs=1e-15)
    assert float(axis.fraction(axis.high)) == pytest.approx(1, rel=1e-15)


def test_values_beside_the_axis_have_fractions_beside_it() -> None:
    assert X.fraction(1e-3) < 0
    assert X.fraction(1e3) > 1
    assert X.fraction(0.0) == -math.inf


def test_axes_are_frozen_keys() -> None:
    assert Axis("lifetime", 1e-9, 2e-9) == Axis("lifetime", 1e-9, 2e-9)
    assert hash(X) == hash(Axis("mode_volume", 1e-2, 1e2, count=64))


def test_ends_of_an_axis_may_be_scalars_of_numpy() -> None:
    axis = Axis("quality_factor", np.int64(1), np.float32(1e3), count=np.int16(9))
    assert axis == Axis("quality_factor", 1.0, 1e3, count=9)
    assert [type(value) for value in (axis.low, axis.high, axis.count)] == [float, float, int]


@pytest.mark.parametrize("name", [name for name, entry in INPUTS.items() if not entry.whole])
def test_any_number_can_be_an_axis(name: str) -> None:
    low, high = INPUTS[name].slider
    log = low > 0 and INPUTS[name].scale.startswith("log")
    axis = Axis(name, low, high, log=log, count=3)
    other = X if name != "mode_volume" else Y
    point = {"emission_wavelength": 2e-6, "medium_index": 1.52}
    point.pop(name, None)
    found = make_map(
        point, axis, Axis(other.name, other.low, other.high, count=2), ["rate_in_fibre"]
    )
    assert found.values["rate_in_fibre"].shape == (2, 3)
    assert np.all(np.isfinite(found.values["rate_in_fibre"]))


# --- the map is the evaluation --------------------------------------------------------------------


def test_a_map_is_one_evaluation_of_the_mesh() -> None:
    wanted = ["peak_purcell", "cavity_share", "rate_in_fibre", "regime", "half_angle"]
    point = {"quality_factor": 7.0, "lifetime": 5e-9}
    found = make_map(point, X, Y, wanted)
    alone = evaluate({**point, **mesh(X, Y)}, wanted)
    for name in wanted:
        assert found.values[name].shape == (48, 64)
        assert np.array_equal(found.values[name], alone[name]), name
    row, column = 11, 40
    cell = evaluate(
        {**point, "quality_factor": Y.values[row], "mode_volume": X.values[column]}, wanted
    )
    for name in wanted:
        one = found.values[name][row, column]
        assert one == (cell[name] if name == "regime" else pytest.approx(cell[name], rel=1e-12))
    assert found.margin is None
    assert found.binding is None
    assert found.outline() == []
    assert not found.caution.any()


def test_cautions_are_joined() -> None:
    low = make_map({}, X, Axis("quality_factor", 1, 100, count=50), [], cautions=["low_quality"])
    assert np.array_equal(low.caution, np.broadcast_to(low.y.values[:, None] < 5, (50, 64)))
    both = make_map(
        {"radiative_share": 0.5},
        Axis("mode_volume", 1e-5, 1, count=40),
        low.y,
        [],
        cautions=["low_quality", "absorbing_small_mode"],
    )
    assert np.array_equal(
        both.caution, (both.y.values[:, None] < 5) | (both.x.values[None, :] < 1e-3)
    )


# --- requirements ---------------------------------------------------------------------------------

#: F = 3Q/(4π²V): on logarithmic axes a straight line.
PURCELL = 3 / (4 * math.pi**2)


def test_outline_of_a_known_region() -> None:
    """F ≥ 100 PURCELL holds above the straight line Q = 100 V: a polygon of known corners."""
    found = make_map({}, X, Y, [], [Requirement("peak_purcell", at_least=100 * PURCELL)])
    assert found.margin is not None
    inside = Y.values[:, None] >= 100 * X.values[None, :] * (1 - 1e-12)
    assert np.array_equal(found.margin >= -1e-12, inside)
    (outline,) = found.outline()
    assert np.allclose(outline[0], outline[-1]), "closed"
    assert outline.min() >= 0
    assert outline.max() <= 1
    # Corners: (0, 0) is Q = 10, V = 0.01, above the line Q = 1; on the top edge V = 1000 is beyond.
    cut = float(X.fraction(10 / 100))  # V where Q = 10 meets the line
    rise = float(Y.fraction(100 * 1e2))  # Q where V = 100 meets the line
    expected = 1 - (1 - cut) * rise / 2
    assert area(outline) == pytest.approx(expected, abs=2e-3)
    slanted = [(x, y) for x, y in outline if 0.01 < x < 0.99 and 0.02 < y < 0.74 and x > cut + 0.02]
    for x, y in slanted:
        assert Y.at(y) == pytest.approx(100 * X.at(x), rel=0.02)
    assert slanted


def test_outline_where_all_or_nothing_meets_the_requirements() -> None:
    nothing = make_map({}, X, Y, [], [Requirement("peak_purcell", at_least=1e30)])
    assert nothing.outline() == []
    everything = make_map({}, X, Y, [], [Requirement("peak_purcell", at_least=0)])
    (outline,) = everything.outline()
    assert area(outline) == pytest.approx(1, abs=1e-3), "the corners of the frame are cut"


def test_outline_of_a_region_in_two_parts() -> None:
    """The placement factor of a standing wave: maxima half a wavelength apart."""
    along = Axis("axial_offset", -300e-9, 300e-9, log=False, count=120)
    point = {"emission_wavelength": 600e-9, "refractive_index": 1.5}  # maxima at 0, ±200 nm
    found = make_map(point, along, Y, [], [Requirement("placement", at_least=0.5)])
    outlines = found.outline()
    assert len(outlines) == 3
    centres = sorted((line[:, 0].min() + line[:, 0].max()) / 2 for line in outlines)
    assert along.at(np.array(centres)) == pytest.approx([-200e-9, 0, 200e-9], abs=2e-9)
    for line in outlines:  # cos² ≥ ½ over a quarter of the wavelength in the medium: ±50 nm
        width = (line[:, 0].max() - line[:, 0].min()) * 600e-9
        assert width == pytest.approx(100e-9, abs=2e-9)


def test_margin_and_binding_requirement() -> None:
    """The margin is the smallest, in natural logarithms of the ratio; binding says whose it is."""
    requirements = [
        Requirement("peak_purcell", at_least=10.0),
        Requirement("resonator_linewidth", at_least=2e13),
    ]
    found = make_map({}, X, Y, [], requirements)
    purcell = np.log(PURCELL * Y.values[:, None] / X.values[None, :] / 10)
    kappa = 2 * math.pi * 299792458 / 650e-9 / Y.values
    width = np.broadcast_to(np.log(kappa / 2e13)[:, None], purcell.shape)
    assert found.margin is not None
    assert found.binding is not None
    assert found.margin == pytest.approx(np.minimum(purcell, width), rel=1e-9, abs=1e-9)
    apart = np.abs(purcell - width) > 1e-9
    assert np.array_equal(found.binding[apart], (width < purcell)[apart].astype(int))
    assert set(np.unique(found.binding)) == {0, 1}


def test_margins_of_limits_at_and_below_zero() -> None:
    found = evaluate({"biexciton_yield": [0.0, 0.3]}, ["g2_zero"])
    g2 = found["g2_zero"]
    least, most = margins(
        found, [Requirement("g2_zero", at_least=0.0), Requirement("g2_zero", at_most=-0.5)]
    )
    assert least == pytest.approx(g2)
    assert most == pytest.approx(-0.5 - g2)


def test_a_cell_without_a_number_meets_nothing() -> None:
    tiny = Axis("mode_volume", 1e-8, 1e-1, count=30)
    point = {"lifetime": 1e-12, "bulk_rate_ratio": 900.0}
    for requirement in (
        Requirement("cavity_share", at_least=0.1),
        Requirement("cavity_share", at_most=2),
    ):
        found = make_map(point, tiny, Y, ["cavity_share", "coupling_rate"], [requirement])
        assert found.margin is not None
        void = np.isnan(found.values["cavity_share"])
        assert void.any()
        assert not void.all()
        assert not np.any(found.margin[void] >= 0)
        assert np.all(np.isfinite(found.margin[~void]))
        for line in found.outline():
            edge = float(tiny.at(line[:, 0].min()))
            assert edge >= tiny.values[void.all(axis=0).argmin()] * 0.5


def test_a_second_requirement_without_a_number_binds() -> None:
    tiny = Axis("mode_volume", 1e-8, 1e-1, count=30)
    point = {"lifetime": 1e-12, "bulk_rate_ratio": 900.0}
    requirements = [
        Requirement("peak_purcell", at_least=1.0),
        Requirement("cavity_share", at_least=0.0),
    ]
    found = make_map(point, tiny, Y, ["cavity_share"], requirements)
    assert found.margin is not None
    assert found.binding is not None
    void = np.isnan(found.values["cavity_share"])
    assert np.array_equal(np.isnan(found.margin), void)
    assert np.all(found.binding[void] == 1)


# --- iso-lines ------------------------------------------------------------------------------------


def test_isolines_of_a_plane_are_straight_and_exact() -> None:
    """Field 2x + 3y in fractions of the axes: the level c is the line 2x + 3y = c."""
    x = (np.arange(40) + 0.5) / 40
    y = (np.arange(30) + 0.5) / 30
    field = 2 * x[None, :] + 3 * y[:, None]
    for level, lines in zip((1.0, 2.5, 9.0), isolines(field, (1.0, 2.5, 9.0)), strict=True):
        if level == 9.0:
            assert lines == []
            continue
        (line,) = lines
        assert 2 * line[:, 0] + 3 * line[:, 1] == pytest.approx(
            np.full(len(line), level), rel=1e-12
        )
        ends = np.sort(line[[0, -1], 0])
        assert ends[1] - ends[0] > 0.25


def test_isolines_of_a_power_law_are_exact_in_logarithms() -> None:
    found = make_map({}, X, Y, ["peak_purcell"])
    levels = [1.0, 100.0]
    for level, lines in zip(levels, found.lines("peak_purcell", levels), strict=True):
        (line,) = lines
        value = PURCELL * Y.at(line[:, 1]) / X.at(line[:, 0])
        assert value == pytest.approx(np.full(len(line), level), rel=1e-9)
    assert found.lines("peak_purcell", [-1.0, 0.0]) == [[], []], "no line at what has no logarithm"


def test_isolines_keep_away_from_cells_without_a_number() -> None:
    field = np.add.outer(np.arange(20.0), np.arange(20.0))
    field[5:9, 5:9] = math.nan
    (lines,) = isolines(field, [13.0])
    assert lines
    for line in lines:
        cells = line * 20 - 0.5
        inside = np.all((cells > 4.99) & (cells < 8.01), axis=1)
        assert not inside.any()


def test_frontiers_are_where_the_regime_changes() -> None:
    """Γ = κ is crossed where the regime turns from 'Purcell' to 'funnelling'."""
    wanted = [name for name, _, _ in FRONTIERS] + ["regime"]
    found = make_map({"fast_linewidth": 1e-9}, X, Y, wanted)
    for name, level, label in FRONTIERS:
        assert label
        assert level == 1.0
        assert name in found.values
    (line,) = found.lines("funnelling_ratio", [1.0])[0]
    changed = found.values["regime"] != "Purcell"
    for x, y in line[:: len(line) // 10]:
        column = min(int(x * 64), 63)
        row = y * 48 - 0.5
        assert not changed[max(int(row), 0), column] or row < 0.5
        assert changed[min(int(row) + 2, 47), column]


def test_strong_frontier_lies_where_exchange_meets_all_losses() -> None:
    point = {"fast_linewidth": 0.0, "lifetime": 1e-9, "dipole_alignment": 1.0}
    high = Axis("quality_factor", 1e3, 1e8, count=60)
    found = make_map(point, X, high, ["strong_ratio", "regime"])
    lines = found.lines("strong_ratio", [1.0])[0]
    assert lines
    for line in lines:
        for x, y in line[:: max(len(line) // 8, 1)]:
            cell = {**point, "mode_volume": float(X.at(x)), "quality_factor": float(high.at(y))}
            assert evaluate(cell, ["strong_ratio"])["strong_ratio"] == pytest.approx(1, rel=0.02)
    strong = found.values["regime"] == "strong"
    assert np.array_equal(strong, found.values["strong_ratio"] > 1)
    assert strong.any()
    assert not strong.all()


def test_the_outline_is_a_chain_of_short_steps() -> None:
    found = make_map({}, X, Y, [], [Requirement("peak_purcell", at_least=3.0)])
    for line in found.outline():
        for (x0, y0), (x1, y1) in pairwise(line):
            assert abs(x1 - x0) <= 1.01 / X.count
            assert abs(y1 - y0) <= 1.01 / Y.count


# --- what a map refuses ---------------------------------------------------------------------------


def test_a_map_refuses_arrays_beside_its_axes() -> None:
    with pytest.raises(InputError, match="lifetime"):
        make_map({"lifetime": np.full(7, 1e-9)}, X, Y, ["peak_purcell"])


def test_a_map_of_an_unknown_quantity_is_refused() -> None:
    with pytest.raises(KeyError, match="brightness"):
        make_map({}, X, Y, ["brightness"])


def test_a_map_beyond_another_input_is_refused() -> None:
    aperture = Axis("numerical_aperture", 0.1, 1.4, log=False, count=14)
    with pytest.raises(InputError, match=r"numerical_aperture\[.*1\.0.*medium_index"):
        make_map({}, aperture, Y, ["collected_share"])
