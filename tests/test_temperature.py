"""Temperature: published broadening laws as whole values, and the width that follows from them."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import constants

from explorer import Axis, Broadening, Design, InputError, Lines, WholeError, evaluate, make_map
from explorer.catalogue import emitters, references
from explorer.published import spectral_width

CUBIC = Broadening([("power", 2e9, 0), ("power", 1e5, 3)], 4, 300)


@pytest.mark.parametrize(
    ("term", "temperature", "hertz"),
    [
        (("power", 1e5, 3), 100.0, 1e11),
        (("power", 7.0, 0), 12.0, 7.0),
        # k·300 K = 25.852 meV, so exp(−1) and 1/(e − 1) at an energy of that size
        (("activated", 1e12, constants.k * 300 / constants.e), 300.0, 1e12 * math.exp(-1)),
        (("phonon", 1e12, constants.k * 300 / constants.e), 300.0, 1e12 / (math.e - 1)),
    ],
)
def test_each_form_of_a_term(term, temperature, hertz) -> None:
    assert Broadening([term], 1, 400).width(temperature) == pytest.approx(hertz, rel=1e-12)


def test_terms_add_up_and_a_cold_phonon_is_frozen() -> None:
    law = Broadening([("power", 3e9, 0), ("phonon", 1e13, 0.03)], 1, 300)
    assert law.width(1.0) == pytest.approx(3e9, rel=1e-12)
    assert np.all(np.diff(law.width(np.geomspace(20, 400, 50))) > 0)


def test_the_fast_linewidth_follows_and_a_given_one_wins() -> None:
    point = {"broadening": CUBIC, "temperature": 200.0, "emission_wavelength": 738e-9}
    expected = spectral_width(CUBIC.width(200.0), "Hz", wavelength=738e-9)
    assert evaluate(point, ["fast_linewidth"])["fast_linewidth"] == pytest.approx(
        expected, rel=1e-13
    )
    given = evaluate({**point, "fast_linewidth": 1e-9}, ["fast_linewidth"])
    assert given["fast_linewidth"] == 1e-9
    assert evaluate({"temperature": 4.0}, ["fast_linewidth"])["fast_linewidth"] == 20e-9


def test_a_line_of_a_spectrum_can_take_the_width_of_the_point() -> None:
    point = {"broadening": CUBIC, "temperature": 77.0, "quality_factor": 2e4}
    width = evaluate(point, ["fast_linewidth"])["fast_linewidth"]
    wanted = ["spectral_overlap", "cavity_share", "device_lifetime", "outside_law"]
    follows = evaluate({**point, "spectrum": Lines([(0.7, 0, None)])}, wanted)
    fixed = evaluate({**point, "spectrum": Lines([(0.7, 0, width)])}, wanted)
    assert follows == pytest.approx(fixed, rel=1e-13)
    assert Lines([(0.7, 0, None)]).follows
    assert not Lines([(0.7, 0, width)]).follows


def test_temperature_is_an_axis_of_a_map_and_answers_how_cold_it_must_be() -> None:
    point = {"broadening": CUBIC, "lifetime": 2e-9, "spectrum": Lines([(0.7, 0, None)])}
    x = Axis("temperature", 4.0, 300.0, count=41)
    y = Axis("quality_factor", 10.0, 1e6, count=33)
    drawn = make_map(point, x, y, ["effective_purcell"])
    values = drawn.values["effective_purcell"]
    assert np.all(np.diff(values, axis=1) < 0), "colder is always better here"
    one = evaluate(
        {**point, "temperature": x.values[7], "quality_factor": y.values[20]}, ["effective_purcell"]
    )
    assert values[20, 7] == pytest.approx(one["effective_purcell"], rel=1e-12)


def test_outside_its_range_a_law_is_cautioned() -> None:
    found = evaluate({"broadening": CUBIC, "temperature": [3.9, 4, 300, 301]}, ["outside_law"])
    assert found["outside_law"].tolist() == [True, False, False, True]
    assert "outside_law" in Design({"broadening": CUBIC, "temperature": 350.0}).cautions()
    assert not evaluate({"temperature": 900.0}, ["outside_law"])["outside_law"]


def test_a_law_that_gives_no_possible_width_is_refused_in_words() -> None:
    wild = Broadening([("power", 1e9, 5)], 4, 300)
    with pytest.raises(InputError, match="as broadening and temperature give it") as caught:
        evaluate({"broadening": wild}, ["spectral_overlap"])
    assert caught.value.name == "fast_linewidth"


@pytest.mark.parametrize(
    ("terms", "low", "high", "words"),
    [
        ([], 4, 300, "one to ten terms"),
        ([("power", 1, 0)] * 11, 4, 300, "one to ten terms"),
        ([("cubic", 1, 3)], 4, 300, "none of power"),
        ([("power", -1, 3)], 4, 300, "not below 0"),
        ([("power", math.nan, 3)], 4, 300, "finite"),
        ([("power", 1, 12)], 4, 300, "exponent 12"),
        ([("phonon", 1, 0)], 4, 300, "above 0"),
        ([("power", 1, 3)], 0, 300, "above 0 K"),
        ([("power", 1, 3)], 300, 4, "rises"),
        ([("power", 1, 3)], 4, math.inf, "rises"),
        ([("power", 1)], 4, 300, "a form and two numbers"),
        ("power", 4, 300, "a form and two numbers"),
        ([("power", 1, 3)], "cold", 300, "temperatures"),
    ],
)
def test_what_is_no_law_is_refused_in_words(terms, low, high, words) -> None:
    with pytest.raises(WholeError, match=words):
        Broadening(terms, low, high)


LAWS = {key: record for key, record in emitters().items() if record.law is not None}


def test_several_emitters_have_a_published_law() -> None:
    assert len(LAWS) >= 4
    for record in LAWS.values():
        assert record.law.source in references()
        assert "K:" in record.law.origin


@pytest.mark.parametrize("key", LAWS)
def test_a_law_gives_the_records_own_width_at_its_temperature(key: str) -> None:
    record = LAWS[key]
    point = record.inputs()
    assert "fast_linewidth" not in point
    width = evaluate(point, ["fast_linewidth"])["fast_linewidth"]
    value = record.values["fast_linewidth"]
    limit = evaluate(point, ["line_below_limit"])["line_below_limit"]
    assert not limit
    if value.value_si > 0:
        assert width == pytest.approx(value.value_si, rel=2e-3)


def width_of(key: str, temperature: float) -> float:
    """FWHM [Hz] of an emitter's law."""
    return float(LAWS[key].law.broadening.width(temperature))


# Printed points that the laws were not drawn through (those that they were are left out).
def test_diamond_vacancies_widen_as_the_fifth_power_when_cold() -> None:
    """Fu et al., Phys. Rev. Lett. 103, 256404 (2009), abstract, seen: T⁵, so ×32 from 30 to 60 K."""
    cold = width_of("nv_membrane_4k", 1e-3)
    ratio = (width_of("nv_membrane_4k", 60) - cold) / (width_of("nv_membrane_4k", 30) - cold)
    assert ratio == pytest.approx(32, rel=1e-6)


def test_silicon_vacancies_widen_by_the_published_slope_near_room_temperature() -> None:
    """arXiv:1906.10526, abstract, seen: 0.062 ± 0.002 nm/K from 295 to 350 K, of nanodiamonds.

    The law is drawn through another sample's width; a tenth is allowed between samples.
    """
    widths = [
        evaluate({**LAWS["siv_bulk"].inputs(), "temperature": one}, ["fast_linewidth"])[
            "fast_linewidth"
        ]
        for one in (295.0, 350.0)
    ]
    assert (widths[1] - widths[0]) / 55 == pytest.approx(0.062e-9, rel=0.1)


def test_hexagonal_boron_nitride_at_liquid_nitrogen() -> None:
    """Arı et al., arXiv:1808.10611, abstract, seen: 172 µeV at 78 K."""
    energy = width_of("hbn_visible", 78) * constants.h / constants.e
    assert energy == pytest.approx(172e-6, rel=0.02)


def test_tin_vacancies_when_cold() -> None:
    """Sedov et al. (2023), abstract, seen: about 0.05 nm at 7 K, 1.1–1.7 nm at room temperature."""
    point = LAWS["snv_microcrystal"].inputs()
    cold = evaluate({**point, "temperature": 7.0}, ["fast_linewidth"])["fast_linewidth"]
    assert cold == pytest.approx(0.05e-9, rel=0.02)


def test_perovskite_dots_stay_within_the_published_room_temperature_widths() -> None:
    """Rainò et al. (2022), abstract, seen: 70–120 meV before treatment at room temperature."""
    for temperature in (293.0, 300.0):
        energy = width_of("cspbbr3_nanocrystal", temperature) * constants.h / constants.e
        assert 0.070 < energy < 0.120


def test_cold_arsenide_dots_are_limited_by_their_lifetime() -> None:
    """Birkedal et al. (2002), abstract, seen: 3.5 µeV at 5 K of others; the law stays below it."""
    energy = width_of("inas_gaas_dot", 5.0) * constants.h / constants.e
    assert 0.8e-6 < energy < 3.5e-6
