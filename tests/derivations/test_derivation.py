"""The shipped coefficients of the indistinguishability are the derived ones."""

from __future__ import annotations

import runpy
from pathlib import Path
from typing import Any

import pytest

from explorer.physics import coherence_terms

SCRIPT = Path(__file__).with_name("indistinguishability.py")


@pytest.fixture(scope="module", name="derived")
def derive() -> dict[str, Any]:
    return runpy.run_path(str(SCRIPT))


def test_shipped_coefficients_are_the_derived_ones(derived: dict[str, Any]) -> None:
    tables = derived["tables"]()
    assert set(tables) == {"CAVITY_SHARE", "OVERLAP", "COHERENCE_DECAY", "SPECTRUM", "TWO_TIMES"}
    for name, table in tables.items():
        assert getattr(coherence_terms, name) == table


def test_known_limits_hold_identically(derived: dict[str, Any]) -> None:
    assert derived["is_printed_form_on_resonance"]()
    assert derived["is_one_without_dephasing"]()
