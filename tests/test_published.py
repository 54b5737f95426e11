"""Every printed value of `tests/published/` against the tool, to the digits that were printed."""

from __future__ import annotations

import ast
import math
import re
import tomllib
from collections.abc import Callable, Iterator
from decimal import Decimal
from pathlib import Path
from typing import Any

import pytest
from scipy import constants, integrate

import explorer
from explorer.catalogue import references
from explorer.inputs import INPUTS
from explorer.physics.interface import air_side, glass_side
from explorer.published import cubic_wavelengths
from explorer.units import si_unit, to_si, unit_name

FOLDER = Path(__file__).parent / "published"
STATUS = {"seen", "from memory", "arithmetic"}
NUMBER = re.compile(r"([+-]?[\d.]+(?:e[+-]?\d+)?)\s*(.*)", re.IGNORECASE)


def point_of(inputs: dict[str, Any]) -> dict[str, Any]:
    """The inputs of a case in SI: text carries a unit, or names a choice or a whole value."""
    point: dict[str, Any] = {}
    for name, value in inputs.items():
        if not isinstance(value, str):
            point[name] = to_si(value, INPUTS[name].shown) if INPUTS[name].shown == "1" else value
        elif INPUTS[name].choices:
            point[name] = value
        elif value.startswith("Lines("):
            point[name] = explorer.Lines(ast.literal_eval(value[len("Lines(") : -1]))
        else:
            number, unit = NUMBER.fullmatch(value).groups()
            point[name] = to_si(float(number), unit)
    return point


def value_of(quantity: str, inputs: dict[str, Any]) -> float:
    return float(explorer.evaluate(point_of(inputs), [quantity])[quantity])


def volume_in_wavelengths(inputs: dict[str, Any]) -> float:
    number, unit = str(inputs["mode_volume"]).split(" ", 1)
    point = point_of({name: value for name, value in inputs.items() if name != "mode_volume"})
    return cubic_wavelengths(
        float(number),
        unit,
        wavelength=point["resonance_wavelength"],
        refractive_index=point["refractive_index"],
    )


def background_g2(inputs: dict[str, Any]) -> float:
    ratio = inputs.pop("signal_to_background")
    signal = value_of("rate_detected", inputs)
    return value_of("g2_zero", {**inputs, "background_rate": f"{signal / ratio!r} 1/s"})


def glass_share(inputs: dict[str, Any]) -> float:
    """By adaptive quadrature over the angles of both sides; only the reciprocity is ours."""
    which = ("horizontal", "vertical").index(inputs["orientation"])
    index = inputs["index"]

    def power(side: Callable[..., Any]) -> float:
        def density(theta: float) -> float:
            import numpy as np

            return float(side(np.float64(theta), index)[which]) * math.sin(theta)

        critical = math.asin(1 / index)
        return float(integrate.quad(density, 0, math.pi / 2, points=[critical], limit=400)[0])

    into_glass = power(glass_side)
    return into_glass / (into_glass + power(air_side))


def fibre_share_ratio(inputs: dict[str, Any]) -> float:
    matched = {**inputs, "fibre_offset": "0 µm", "fibre_mode_radius": inputs["aperture_radius"]}
    return value_of("fibre_share", inputs) / value_of("fibre_share", matched)


CHECKS: dict[str, Callable[[dict[str, Any]], float]] = {
    "volume_in_wavelengths": volume_in_wavelengths,
    "photon_lifetime": lambda inputs: 1 / value_of("resonator_linewidth", inputs),
    "linewidth_energy": lambda inputs: (
        constants.hbar * value_of("resonator_linewidth", inputs) / constants.e
    ),
    "coupling_energy": lambda inputs: (
        constants.hbar * value_of("coupling_rate", inputs) / constants.e
    ),
    "four_g_over_kappa": lambda inputs: (
        4 * value_of("coupling_rate", inputs) / value_of("resonator_linewidth", inputs)
    ),
    "strong_coupling": lambda inputs: float(
        explorer.evaluate(point_of(inputs), ["regime"])["regime"] == "strong"
    ),
    "photon_yield": lambda inputs: (
        value_of("cavity_share", inputs) + value_of("other_share", inputs)
    ),
    "fourier_limit": lambda inputs: (
        value_of(
            "coherence_decay",
            {**inputs, "fast_linewidth": "0 nm", "mode_volume": 1e8, "quantum_yield": 1},
        )
        / (2 * math.pi)
    ),
    "fourier_energy": lambda inputs: (
        value_of(
            "coherence_decay",
            {**inputs, "fast_linewidth": "0 nm", "mode_volume": 1e8, "quantum_yield": 1},
        )
        * constants.hbar
        / constants.e
    ),
    "background_g2": background_g2,
    "half_collected": lambda inputs: value_of("collected_share", inputs) / 2,
    "glass_share": glass_share,
    "fibre_share_ratio": fibre_share_ratio,
}


def cases() -> Iterator[Any]:
    for file in sorted(FOLDER.glob("*.toml")):
        table = tomllib.loads(file.read_text(encoding="utf-8"))
        for index, case in enumerate(table.pop("case")):
            if "quantity" in case:  # a case's own quantity wins over a file's check
                entry = {**{key: value for key, value in table.items() if key != "check"}, **case}
            else:
                entry = {**table, **case}
            yield pytest.param(entry, id=f"{file.stem}-{index}")


def printed(text: str) -> tuple[float, float, str]:
    """A printed value in SI, half a unit of its last digit in SI, and the SI unit."""
    found = NUMBER.fullmatch(text)
    assert found is not None, text
    number, unit = found.groups()
    decimal = Decimal(number)
    half = Decimal((0, (1,), int(decimal.as_tuple().exponent))) / 2
    name = unit_name(unit)
    if name == "%":
        return float(decimal) / 100, float(half) / 100, "1"
    return to_si(float(decimal), name), to_si(float(half), name), si_unit(name)


@pytest.mark.parametrize("entry", list(cases()))
def test_printed_value(entry: dict[str, Any]) -> None:
    check = entry.get("check")
    inputs = dict(entry["inputs"])
    value = CHECKS[check](inputs) if check else value_of(entry["quantity"], inputs)
    want, half, _ = printed(entry["printed"])
    if entry.get("at_least"):
        assert value >= want
    elif entry.get("at_most"):
        assert value <= want
    elif "tolerance" in entry:
        assert entry["why"], "a tolerance wider than the digits needs a reason"
        assert value == pytest.approx(want, rel=entry["tolerance"])
    else:
        assert abs(value - want) <= half * (1 + 1e-9), f"{value} is not {entry['printed']}"


def files() -> list[dict[str, Any]]:
    return [
        tomllib.loads(file.read_text(encoding="utf-8")) for file in sorted(FOLDER.glob("*.toml"))
    ]


@pytest.mark.parametrize("table", files(), ids=lambda table: table["source"])
def test_every_file_says_where_its_values_stand(table: dict[str, Any]) -> None:
    assert table["status"] in STATUS
    assert table["where"]
    assert table["source"] in references() or table["source"] == "common practice"
    if table["status"] == "seen":
        assert references()[table["source"]].seen


def test_at_least_twelve_sources_eight_of_them_seen() -> None:
    sources = {table["source"] for table in files()}
    seen = {table["source"] for table in files() if table["status"] == "seen"}
    assert len(sources - {"common practice"}) >= 12
    assert len(seen) >= 8
