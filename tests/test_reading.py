"""Numbers as people type them: read as meant or refused, never silently as something else."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from explorer.reading import ReadingError, read_number
from explorer.units import text

from .strategies import tried

TURN = 2 * math.pi


@pytest.mark.parametrize(
    ("typed", "unit", "value"),
    [
        ("650", "nm", 650e-9),
        (" 0.65 µm ", "nm", 650e-9),
        ("0,65um", "nm", 650e-9),
        ("1e4", "1", 1e4),
        ("1E-4 m", "nm", 1e-4),
        ("1×10^4", "1", 1e4),
        ("3 x 10^-7", "1", 3e-7),
        ("3*10**4", "1", 3e4),
        ("3×10⁻⁷ m", "nm", 3e-7),
        ("−2·10^3", "1", -2e3),
        ("10^4", "1", 1e4),
        ("10⁴ nm", "nm", 1e-5),
        ("-10⁻³", "1", -1e-3),
        ("10", "1", 10.0),
        ("1/3", "1", 1 / 3),
        ("40 %", "1", 0.4),
        ("35°", "rad", math.radians(35)),
        ("35 deg", "rad", math.radians(35)),
        ("8.4 M/s", "1/s", 8.4e6),
        ("2.00 T/s", "1/s", 2e12),
        ("5 P/s", "1/s", 5e15),
        ("0.500 /s", "1/s", 0.5),
        ("2π × 20.7 THz", "rad/s", TURN * 20.7e12),
        ("2 pi * 3 GHz", "rad/s", TURN * 3e9),
        ("2π×1e6", "rad/s", TURN * 1e6),
        ("∞", "nm", math.inf),
        ("none", "nm", math.inf),
    ],
)
def test_what_is_read(typed: str, unit: str, value: float) -> None:
    assert read_number(typed, unit) == pytest.approx(value, rel=1e-15)


@pytest.mark.parametrize(
    ("typed", "unit", "why"),
    [
        ("3×1000", "nm", "10^4"),
        ("3x100 nm", "nm", "10^4"),
        ("2*105", "Hz", "10^4"),
        ("3×10", "nm", "10^4"),
        ("3x10 4", "1", "10^4"),
        ("2×10^4×3", "1", "10^4"),
        ("3**2", "1", "10^4"),
        ("1.5×10⁻", "1", "10^4"),
        ("110⁴", "1", "unit"),
        ("2 10^4", "1", "unit"),
        ("10 000", "1", "unit"),
        ("650 NM", "nm", "NM"),
        ("5 m/s", "M/s", "m/s"),
        ("20 xyz", "nm", "xyz"),
        ("3 GHz", "rad/s", "rad/s"),
        ("2π × 3 GHz", "MHz", "unit"),
        ("2π", "rad/s", "unit"),
        ("1e400", "1", "large"),
        ("1/0", "1", "zero"),
        ("", "1", "no number"),
        ("a few", "nm", "20 nm"),
    ],
)
def test_what_is_refused(typed: str, unit: str, why: str) -> None:
    with pytest.raises(ReadingError) as caught:
        read_number(typed, unit)
    assert why in str(caught.value)
    assert str(caught.value).isprintable()


@tried(600)
@given(
    value=st.floats(1e-25, 1e25) | st.floats(-1e25, -1e-25) | st.just(0.0),
    unit=st.sampled_from(["1", "m", "s", "eV", "1/s", "rad", "rad/s", "(λ/n)³", "%", "K"]),
)
def test_what_is_written_can_be_read_back(value: float, unit: str) -> None:
    back = read_number(text(value, unit, 6), unit)
    assert back == pytest.approx(value, rel=1e-5), text(value, unit, 6)
