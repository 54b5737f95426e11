"""What the papers beside the code say of it is so."""

from __future__ import annotations

import re
from dataclasses import fields
from pathlib import Path

from explorer import INPUTS, __version__
from explorer.registry import Input, Quantity

ROOT = Path(__file__).resolve().parent.parent


def test_the_citation_is_of_this_version_and_dated_once_it_is_released() -> None:
    citation = (ROOT / "CITATION.cff").read_text(encoding="utf-8")
    changes = (ROOT / "CHANGELOG.md").read_text(encoding="utf-8")
    assert f"version: {__version__}\n" in citation
    assert f"## {__version__}" in changes
    unreleased = f"## {__version__} (unreleased)" in changes
    assert ("date-released" in citation) != unreleased


def test_readme_points_to_where_the_names_are() -> None:
    readme = (ROOT / "README.md").read_text(encoding="utf-8")
    assert "help(explorer.evaluate)" not in readme, "it lists no names, units or formulas"
    names = readme.split("Names, units, domains")[1].split("\n\n")[0]
    assert "`explorer.INPUTS`" in names
    assert "`explorer.QUANTITIES`" in names


def test_the_scales_of_inputs_are_the_described_ones() -> None:
    assert Input.__doc__
    described = Input.__doc__.split("scale: ")[1].split("meaning:")[0]
    assert set(re.findall(r"'([^']+)'", described)) == {entry.scale for entry in INPUTS.values()}


def test_every_field_of_a_quantity_is_described() -> None:
    described = set(re.findall(r"\w+", (Quantity.__doc__ or "").lower()))
    assert "limits" not in described, "it has none"
    assert {field.name for field in fields(Quantity)} - {"name", "group"} <= described
