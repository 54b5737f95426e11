"""The key-rate helper against published limits and worked values.

Worked values marked "arithmetic" were computed from the printed formulas by hand-written code apart
from this package; the printed sources are named in `explorer/keyrate.py`.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.optimize import brentq

from explorer import keyrate
from explorer.keyrate import Link, LinkError, secret_key

CLOCK = 1e6


def link(**changes: object) -> Link:
    """A link whose arrival is 10^(-loss/10) and whose dark share is 1e-6 unless changed."""
    settings = {"clock": CLOCK, "loss": 10.0, "receiver": 1.0, "dark_rate": 1.0}
    return Link(**(settings | changes))


# mean photons, g2, loss [dB] -> error, Δ, bit per pulse for general and for individual attacks;
# dark share 1e-6, error 1 %, f = 1.16, q = 1/2. Arithmetic.
@pytest.mark.parametrize(
    ("mean", "g2", "loss", "error", "known", "general", "individual"),
    [
        (0.1, 0.1, 10, 0.0100490, 0.0499950, 3.878078e-3, 3.998899e-3),
        (0.1, 0.01, 20, 0.0104895, 0.0499500, 3.850567e-4, 3.973928e-4),
        (0.024, 0.034, 20, 0.0120332, 0.0406307, 9.122783e-5, 9.440169e-5),
        (0.5, 0.036, 10, 0.0100098, 0.0899982, 1.841830e-2, 1.900752e-2),
    ],
)
def test_worked_values(mean, g2, loss, error, known, general, individual) -> None:
    found = secret_key(link(loss=loss), mean * CLOCK, g2)
    assert found.error == pytest.approx(error, abs=5e-8)
    assert found.known == pytest.approx(known, abs=5e-8)
    assert found.rate / CLOCK == pytest.approx(general, rel=1e-6)
    other = secret_key(link(loss=loss, attacks="individual"), mean * CLOCK, g2)
    assert other.rate / CLOCK == pytest.approx(individual, rel=1e-6)


def largest_error(attacks: str, correction: float) -> float:
    """Error at which the key of a perfect source without dark counts ends."""

    def rate(error: float) -> float:
        perfect = Link(CLOCK, 0.0, 1.0, 0.0, None, error, correction, 1.0, attacks)
        return float(secret_key(perfect, CLOCK, 0.0).rate) / CLOCK - 1e-9

    return brentq(rate, 0.05, 0.2)


def test_eleven_per_cent_of_errors_end_the_key() -> None:
    """Gisin et al., Rev. Mod. Phys. 74, 145 (2002): 11 % for general attacks, seen."""
    assert round(largest_error("general", 1.0), 2) == 0.11


# 1 − (1 + f) H(e) = 0 and τ(e) = f H(e): arithmetic.
@pytest.mark.parametrize(
    ("attacks", "correction", "error"),
    [
        ("general", 1.0, 0.110028),
        ("general", 1.16, 0.09811),
        ("general", 1.22, 0.09424),
        ("individual", 1.0, 0.11377),
        ("individual", 1.16, 0.10176),
    ],
)
def test_largest_errors(attacks: str, correction: float, error: float) -> None:
    assert largest_error(attacks, correction) == pytest.approx(error, abs=6e-6)


@pytest.mark.parametrize("attacks", keyrate.ATTACKS)
def test_an_ideal_source_gives_a_bit_for_two_photons(attacks: str) -> None:
    ideal = Link(CLOCK, 0.0, 1.0, 0.0, None, 0.0, 1.0, 0.5, attacks)
    assert secret_key(ideal, CLOCK, 0.0).rate == pytest.approx(CLOCK / 2, rel=1e-12)


def test_without_noise_the_loss_limit_is_that_of_the_second_photon() -> None:
    """−10 log10(μ g2/2): 23.01 dB for μ = g2 = 0.1, where every click may be a pair. Arithmetic."""
    clean = link(dark_rate=0.0, error=0.0)
    assert keyrate.largest_loss(clean, 0.1 * CLOCK, 0.1) == pytest.approx(23.01, abs=0.02)


def test_distance_at_which_a_quarter_of_the_bits_are_wrong() -> None:
    """Lo, Ma and Chen, Phys. Rev. Lett. 94, 230504 (2005): 208 km; from memory, as are its inputs.

    Detector 4.5 %, background 1.7e-6 a pulse, misalignment 3.3 %, fibre 0.21 dB/km; of a pulse that
    holds one photon.
    """

    def wrong(kilometres: float) -> float:
        far = link(
            loss=keyrate.fibre_loss(1000 * kilometres, 0.21),
            receiver=0.045,
            dark_rate=1.7e-6 * CLOCK,
            error=0.033,
        )
        return float(secret_key(far, CLOCK, 0.0).error) - 0.25

    assert round(brentq(wrong, 100, 300)) == 208


def test_the_needed_rate_gives_the_wanted_key_and_less_light_does_not() -> None:
    here = link(loss=15.0)
    for g2 in (0.0, 0.01, 0.1):
        wanted = 0.5 * float(secret_key(here, keyrate.best_rate(here, g2), g2).rate)
        needed = keyrate.needed_rate(here, wanted, g2)
        assert secret_key(here, needed, g2).rate == pytest.approx(wanted, rel=1e-9)
        below = np.linspace(0.01, 0.99, 50) * needed
        assert np.all(secret_key(here, below, g2).rate < wanted)


def test_more_pairs_need_more_light_and_at_last_none_helps() -> None:
    here = link(loss=18.0)
    needed = [keyrate.needed_rate(here, 150.0, g2) for g2 in (0.0, 0.02, 0.05, 0.1)]
    assert needed == sorted(needed)
    with pytest.raises(LinkError, match=r"at most .* bit/s"):
        keyrate.needed_rate(here, 1e5, 0.1)


def test_the_largest_g2_is_where_the_key_just_is_what_is_wanted() -> None:
    here = link(loss=15.0)
    found = keyrate.largest_g2(here, 300.0, 0.05 * CLOCK)
    assert 0 < found < 1
    assert secret_key(here, 0.05 * CLOCK, found).rate == pytest.approx(300.0, rel=1e-9)
    assert keyrate.largest_g2(link(loss=0.0), 1.0, 0.01 * CLOCK) == 1.0
    with pytest.raises(LinkError, match="whatever the purity"):
        keyrate.largest_g2(here, 1e6, 0.05 * CLOCK)


def test_too_much_light_tells_more_than_it_adds() -> None:
    here = link(loss=20.0)
    best = keyrate.best_rate(here, 0.1)
    rates = secret_key(here, np.array([0.5, 1.0, 1.5]) * best, 0.1).rate
    assert rates[1] > rates[0]
    assert rates[1] > rates[2]


# Visibility [km], then dB/km at 785, 850, 1550 nm: arithmetic from the printed exponents (from memory).
@pytest.mark.parametrize(
    ("visibility", "losses"),
    [
        (0.5, (33.96, 33.96, 33.96)),
        (1, (14.21, 13.66, 10.12)),
        (2, (6.714, 6.370, 4.285)),
        (4, (2.996, 2.771, 1.538)),
        (10, (1.069, 0.964, 0.442)),
        (23, (0.465, 0.419, 0.192)),
        (60, (0.160, 0.141, 0.054)),
    ],
)
def test_haze(visibility: float, losses: tuple[float, ...]) -> None:
    for wavelength, expected in zip((785e-9, 850e-9, 1550e-9), losses, strict=True):
        found = keyrate.air_loss(1000.0, 1000 * visibility, wavelength)
        assert found == pytest.approx(expected, rel=4e-3)


def test_in_fog_all_wavelengths_fare_alike() -> None:
    """Kim et al., Proc. SPIE 4214, 26 (2001), abstract, seen: below 500 m, 785, 850 and 1550 nm."""
    found = {keyrate.air_loss(1000.0, 400.0, one * 1e-9) for one in (785, 850, 1550)}
    assert max(found) - min(found) < 1e-9


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"clock": 0.0}, "clock"),
        ({"loss": -1.0}, "loss"),
        ({"receiver": 1.1}, "receiver"),
        ({"receiver": "half"}, "receiver"),
        ({"dark_rate": -1.0}, "dark_rate"),
        ({"dark_rate": 2e6}, "fill every pulse"),
        ({"gate": 1.0}, "gate"),
        ({"error": 0.6}, "error"),
        ({"error": math.nan}, "error"),
        ({"correction": 0.9}, "correction"),
        ({"sifting": 0.0}, "sifting"),
        ({"attacks": "coherent"}, "attacks"),
    ],
)
def test_what_is_no_link_is_refused_in_words(changes, words) -> None:
    with pytest.raises(LinkError, match=words):
        link(**changes)


def test_nothing_sent_and_nothing_dark_is_no_key() -> None:
    silent = link(dark_rate=0.0)
    assert secret_key(silent, 0.0, 0.0).rate == 0.0
