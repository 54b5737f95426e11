"""The catalogue: every number has unit, source and place; units are converted right."""

from __future__ import annotations

import math
from pathlib import Path

import pytest
from scipy import constants

from explorer import catalogue, published
from explorer.catalogue import CatalogueError
from explorer.inputs import INPUTS
from explorer.whole import Lines

ALL = [
    record
    for records in (catalogue.emitters(), catalogue.resonators(), catalogue.optics())
    for record in records.values()
]


def each(record: published.Record) -> str:
    return f"{record.kind}/{record.key}"


def test_there_are_eight_emitters_and_eight_resonators_of_different_classes() -> None:
    for records in (catalogue.emitters(), catalogue.resonators()):
        assert len(records) >= 8
        assert len({record.class_ for record in records.values()}) >= 8
    assert {record.choices["destination"] for record in catalogue.optics().values()} == {
        "free_space",
        "fibre",
    }


def test_no_record_has_a_fault() -> None:
    assert catalogue.check_records() == []


@pytest.mark.parametrize("record", ALL, ids=each)
def test_every_number_has_unit_source_and_place(record: published.Record) -> None:
    for value in record.every_value():
        assert value.unit
        assert value.where
        assert value.shown
        assert value.checked in ("seen", "from memory")
        assert (
            value.source == published.COMMON
            or value.reference == catalogue.references()[value.source]
        )


@pytest.mark.parametrize("record", ALL, ids=each)
def test_every_input_of_a_record_is_an_input_with_an_origin(record: published.Record) -> None:
    point = record.inputs()
    assert set(point) <= set(INPUTS)
    assert set(record.origins()) == set(point)
    for checked, text in record.origins().values():
        assert checked in ("seen", "from memory")
        assert text


@pytest.mark.parametrize("record", ALL, ids=each)
def test_what_is_from_memory_is_called_doubtful(record: published.Record) -> None:
    if any(value.checked != "seen" for value in record.every_value()):
        assert len(record.doubts) > 20


def test_references_are_complete_and_never_seen_without_an_address() -> None:
    for key, reference in catalogue.references().items():
        assert key == key.lower()
        assert reference.authors
        assert reference.journal
        if reference.seen != "nothing":
            assert reference.doi or reference.url or reference.read_at or reference.volume, key


def test_formulas_cite_known_sources() -> None:
    import explorer

    for name, quantity in explorer.QUANTITIES.items():
        assert quantity.source == "definition" or quantity.source in catalogue.references(), name


def test_two_fifths_and_more_of_what_decides_was_seen() -> None:
    for kind, records in (
        ("emitters", catalogue.emitters()),
        ("resonators", catalogue.resonators()),
    ):
        values = [value for record in records.values() for value in record.deciding().values()]
        seen = sum(value.checked == "seen" for value in values)
        print(f"{kind}: {seen} of {len(values)} deciding values seen")
        assert seen >= 0.4 * len(values)


# By hand: E = hc/λ, so a small ΔE is Δλ = λ² ΔE/(hc); 60 meV at 650 nm is 20.4 nm, to the per mille.
@pytest.mark.parametrize(
    ("width", "unit", "wavelength", "metres"),
    [
        (60, "meV", 650e-9, 20.44e-9),
        (90, "meV", 515e-9, 19.25e-9),
        (55, "µeV", 750e-9, 24.95e-12),
        (1, "GHz", 1000e-9, 3.336e-12),
        (0.159, "GHz", 637e-9, 0.2152e-12),
        (0.7, "nm", 738e-9, 0.7e-9),
        (0, "µeV", 930e-9, 0),
    ],
)
def test_widths_by_hand(width: float, unit: str, wavelength: float, metres: float) -> None:
    found = published.spectral_width(width, unit, wavelength=wavelength)
    assert found == pytest.approx(metres, rel=1e-3)


@pytest.mark.parametrize("energy", [1e-9, 1e-6, 1e-3, 0.06, 0.3, 0.9])
def test_width_is_the_inverse_of_the_angular_width(energy: float) -> None:
    wavelength = 650e-9
    width = published.spectral_width(energy, "eV", wavelength=wavelength)
    angular = 2 * math.pi * constants.c * width / (wavelength**2 - width**2 / 4)
    assert angular * constants.hbar == pytest.approx(energy * constants.e, rel=1e-13)


# By hand: 0.070 µm³ at 1570 nm, n = 3.4: λ/n = 0.46176 µm, cubed 0.098460 µm³.
@pytest.mark.parametrize(
    ("volume", "unit", "wavelength", "index", "expected"),
    [
        (0.070, "µm³", 1570e-9, 3.4, 0.7109),
        (7.0e-14, "cm³", 1570e-9, 3.4, 0.7109),
        (3e-4, "λ³", 1550e-9, 3.48, 0.01264),
        (3.9, "λ³", 637e-9, 2.41, 54.59),
        (40, "nm³", 660e-9, 1.4, 3.818e-7),
        (0.65, "(λ/n)³", 780e-9, 3.4, 0.65),
    ],
)
def test_volumes_by_hand(
    volume: float, unit: str, wavelength: float, index: float, expected: float
) -> None:
    found = published.cubic_wavelengths(volume, unit, wavelength=wavelength, refractive_index=index)
    assert found == pytest.approx(expected, rel=1e-3)


def test_a_length_is_no_volume_and_a_time_no_width() -> None:
    with pytest.raises(ValueError, match="mode volume"):
        published.cubic_wavelengths(1, "nm", wavelength=1e-6, refractive_index=1)
    with pytest.raises(ValueError, match="linewidth"):
        published.spectral_width(1, "ns", wavelength=1e-6)


def test_a_composite_spectrum_leaves_out_what_has_no_published_centre() -> None:
    centre = catalogue.emitters()["siv_nanodiamond"].inputs()
    assert centre["spectrum"] == Lines([(0.7, 0.0, 0.7e-9)])
    broad = catalogue.emitters()["nv_nanodiamond"].inputs()["spectrum"]
    assert broad.known_share == pytest.approx(1)
    assert broad.lines[0][1] == pytest.approx(-53e-9)


def test_a_resonator_can_follow_the_emission() -> None:
    record = catalogue.resonators()["micropillar"]
    assert record.inputs()["resonance_wavelength"] == 930e-9
    assert "resonance_wavelength" not in record.inputs(own_wavelength=False)


VALUE = 'value = 1\nunit = "ns"\nsource = "luo2018"\nwhere = "abstract"\nchecked = "seen"\n'
HEAD = 'name = "x"\nclass = "y"\nsummary = "z"\n'


@pytest.mark.parametrize(
    ("text", "complaint"),
    [
        ("name = ", "x.toml"),
        ("", "name is missing"),
        (HEAD, "values is missing"),
        (HEAD + "[values.lifetme]\n" + VALUE, "lifetme is no input"),
        (HEAD + "[values.lifetime]\n" + VALUE.replace('"ns"', '"nm"'), "is no unit of it"),
        (HEAD + "[values.lifetime]\n" + VALUE.replace('"ns"', '"parsec"'), "unknown unit"),
        (HEAD + "[values.lifetime]\n" + VALUE.replace("luo2018", "nobody1900"), "no source"),
        (HEAD + "[values.lifetime]\n" + VALUE.replace('"seen"', '"sure"'), "checked is"),
        (HEAD + "[values.lifetime]\n" + VALUE.replace("value = 1", 'value = "one"'), "one"),
        (HEAD + "[values.lifetime]\n" + VALUE.replace('where = "abstract"\n', ""), "no where"),
        (HEAD + "[values.fast_linewidth]\n" + VALUE.replace('"ns"', '"meV"'), "needs a wavelength"),
        (HEAD + "values = 3\n", "x.toml"),
        (HEAD + "[values.lifetime]\n" + VALUE + "[[line]]\nrole = 'a'\n", "needs share"),
        (HEAD + "[values.lifetime]\n" + VALUE + "[enhancement]\nvalue = 5\n", "no meaning"),
    ],
)
def test_a_malformed_record_is_refused_in_words(tmp_path: Path, text: str, complaint: str) -> None:
    file = tmp_path / "x.toml"
    file.write_text(text, encoding="utf-8")
    with pytest.raises(CatalogueError, match=complaint) as caught:
        catalogue.parse_record("emitters", file)
    assert "x.toml" in str(caught.value)
    assert "\n" not in str(caught.value)
