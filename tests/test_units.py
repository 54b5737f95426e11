"""Units: exact conversions both ways, and numbers as people write them."""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from explorer import units

POWERS = [name for name in units.EXPONENTS if name != "°"]
floats = st.floats(min_value=1e-290, max_value=1e290)
fixed = settings(derandomize=True, database=None, deadline=None)


@pytest.mark.parametrize("unit", POWERS)
def test_a_unit_is_a_shift_of_the_exponent(unit: str) -> None:
    exponent = units.EXPONENTS[unit][1]
    assert units.to_si(650, unit) == float(f"650e{exponent}")
    assert units.from_si(float(f"650e{exponent}"), unit) == 650
    assert units.to_si(0.1 + 0.2, unit) == float(f"0.30000000000000004e{exponent}")


@pytest.mark.parametrize("unit", POWERS)
@fixed
@given(value=floats, sign=st.sampled_from([1, -1]))
def test_there_and_back(unit: str, value: float, sign: int) -> None:
    """A float in the shown unit is at most one rounding away, so it comes back to the same digits."""
    there = units.from_si(sign * value, unit)
    assert units.to_si(there, unit) == pytest.approx(sign * value, rel=3e-16)


@pytest.mark.parametrize("unit", units.EXPONENTS)
def test_what_has_no_digits_stays(unit: str) -> None:
    assert units.to_si(0.0, unit) == 0
    assert units.to_si(math.inf, unit) == math.inf
    assert units.from_si(-math.inf, unit) == -math.inf
    assert math.isnan(units.to_si(math.nan, unit))


def test_degrees() -> None:
    assert units.to_si(180, "°") == math.pi
    assert units.from_si(math.pi / 4, "deg") == 45
    assert units.si_unit("°") == "rad"


@pytest.mark.parametrize("spelling", units.SPELLINGS)
def test_other_spellings(spelling: str) -> None:
    assert units.unit_name(spelling) in units.EXPONENTS
    assert units.to_si(1, spelling) == units.to_si(1, units.SPELLINGS[spelling])


def test_both_micro_signs_and_the_letter_are_one() -> None:
    assert {units.unit_name(unit) for unit in ("µm", "μm", "um")} == {"µm"}


@pytest.mark.parametrize("unit", ["parsec", "NM", "nm ", "m2", "1/m"])
def test_an_unknown_unit_is_refused_with_the_known_ones(unit: str) -> None:
    for call in (units.to_si, units.from_si):
        with pytest.raises(ValueError, match="unknown unit") as caught:
            call(1.0, unit)
        assert repr(unit) in str(caught.value)
        assert "nm" in str(caught.value)
        assert "\n" not in str(caught.value)


def test_every_family_has_one_si_unit_of_its_own() -> None:
    for unit, (family, _) in units.EXPONENTS.items():
        assert units.si_unit(unit) == family
        assert units.EXPONENTS[family] == (family, 0)


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (8.4e6, "1/s", "8.40 M/s"),
        (999.6, "1/s", "1.00 k/s"),
        (0.0, "1/s", "0 /s"),
        (0.5, "1/s", "0.500 /s"),
        (2e-5, "1/s", "2.00×10^-5 /s"),
        (2e12, "1/s", "2.00 T/s"),
        (3e19, "1/s", "30000 P/s"),
        (0.5, "rad/s", "2π × 0.0796 Hz"),
        (0.0, "rad/s", "0 rad/s"),
        (1e-14, "m", "10.0 fm"),
        (1234.5, "m", "1230 m"),
        (23e-9, "m", "23.0 nm"),
        (1e-3, "m", "1.00 mm"),
        (1.2e-9, "s", "1.20 ns"),
        (9.996e-10, "s", "1.00 ns"),
        (math.radians(35), "rad", "35.0°"),
        (2 * math.pi * 1e9, "rad/s", "2π × 1.00 GHz"),
        (0.123, "1", "0.123"),
        (0.0, "1", "0"),
        (0.25, "%", "25.0 %"),
        (1234.5, "1", "1230"),
        (1.5e-7, "1", "1.50×10^-7"),
        (2.5e8, "1", "2.50×10^8"),
        (0.5, "(λ/n)³", "0.500 (λ/n)³"),
        (math.inf, "m", "∞"),
        (-math.inf, "m", "−∞"),
        (math.nan, "1/s", "no number"),
        (-3e-9, "m", "-3.00 nm"),
    ],
)
def test_numbers_as_people_write_them(value: float, unit: str, text: str) -> None:
    assert units.text(value, unit) == text


@fixed
@given(value=floats, unit=st.sampled_from(["1", "m", "s", "1/s", "rad", "rad/s", "(λ/n)³", "%"]))
def test_any_number_can_be_written(value: float, unit: str) -> None:
    text = units.text(value, unit)
    assert text.isprintable()
    assert 1 <= len(text) < 400
