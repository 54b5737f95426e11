"""Records: inputs back bit for bit, outcome to 1e-12, a published schema, files whole or not at all.

What a record refuses is in test_bad_input.
"""

from __future__ import annotations

import errno
import itertools
import json
import math
import os
import struct
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st
from jsonschema import Draft202012Validator

from explorer import (
    CAUTIONS,
    INPUTS,
    QUANTITIES,
    Broadening,
    Decision,
    Design,
    InputError,
    Lines,
    Origin,
    Pattern,
    RecordError,
    Requirement,
    Samples,
    Spread,
    Unknown,
    __version__,
    design_text,
    evaluate,
    load_design,
    save_design,
)
from explorer.design import ORIGINS
from explorer.exact import number_in, parse, serialise, value_of
from explorer.record import design_from
from explorer.scatter import kinds_for
from explorer.schema import FORMAT, VERSION, schema, shipped
from explorer.units import EXPONENTS, to_si

from .strategies import Point, points, tried

PLAIN = Draft202012Validator(schema())
SCRIPT = (
    '<img src=x onerror="alert(1)"> <script>alert(2)</script> javascript:alert(3) \\" \u2028 {{x}}'
)


def full() -> Design:
    return Design(
        {
            "lifetime": 3.3e-9,
            "filter_width": math.inf,
            "destination": "fibre",
            "spectrum": Lines([(0.6, 0.1e-9, 2e-9), (0.2, -9e-9, 0.0), (0.1, 3e-9, None)]),
            "broadening": Broadening([("power", 1e5, 3), ("phonon", 2e11, 0.015)], 4, 300),
            "pattern": Pattern([0.0, 0.1, 1.0], [3.0, 1.0, 0.0]),
        },
        requirements=(
            Requirement("rate_in_fibre", at_least=2e7),
            Requirement("g2_zero", at_most=0.1),
        ),
        scatter={
            "resonance_wavelength": Spread("normal", 1e-9),
            "mode_volume": Spread("lognormal", 0.2),
        },
        unknowns={"quantum_yield": Unknown(0.5, 0.9), "axial_offset": Unknown(-1e-8, 2e-8)},
        origins={
            "lifetime": Origin("seen", "purcell1946", "table 1"),
            "spectrum": Origin("measured"),
        },
        correlation={"resonance_wavelength|mode_volume": -0.4},
        name="harbour office → lighthouse",
        note="two lines\n\tand a tab",
        decision=Decision("the meeting", "cheapest", "width of the line"),
        emitter="nv_nanodiamond",
        resonator="micropillar",
        optic="objective",
        data={"spectrum.csv": "ab" * 32},
    )


def bits(value: float) -> bytes:
    return struct.pack("<d", value)


def assert_same_bits(one: Any, other: Any) -> None:
    """Equal, and the same bits of every number (so minus zero stays minus zero)."""
    assert type(one) is type(other)
    assert one == other
    if isinstance(one, float):
        assert bits(one) == bits(other)
    elif isinstance(one, Lines):
        assert [n if n is None else bits(n) for row in one.lines for n in row] == [
            n if n is None else bits(n) for row in other.lines for n in row
        ]
    elif isinstance(one, Broadening):
        assert [bits(n) for row in one.terms for n in row[1:]] == [
            bits(n) for row in other.terms for n in row[1:]
        ]
    elif isinstance(one, Samples):
        assert (
            one.offsets.tobytes() + one.counts.tobytes()
            == other.offsets.tobytes() + other.counts.tobytes()
        )
    elif isinstance(one, Pattern):
        assert (
            one.angles.tobytes() + one.powers.tobytes()
            == other.angles.tobytes() + other.powers.tobytes()
        )


def check_round_trip(point: Point) -> None:
    design = Design(point)
    text = design_text(design)
    record = json.loads(text)
    error = next(PLAIN.iter_errors(record), None)
    assert error is None, error
    back = design_from(text.encode())
    assert list(back.point) == [name for name in INPUTS if name in point]
    for name in point:
        assert_same_bits(design.point[name], back.point[name])
    assert back == design
    before, after = design.outcome(), back.outcome()
    for name in QUANTITIES:
        if QUANTITIES[name].kind != "number":
            assert after[name] == before[name] == record["outcome"][name]["value"]
        else:
            assert after[name] == pytest.approx(before[name], rel=1e-12, nan_ok=True)
            entry = record["outcome"][name]
            written = value_of_plain(entry["value"], entry["unit"])
            assert written == pytest.approx(before[name], rel=1e-12, nan_ok=True)
    assert sorted(record["inputs"]["given"]) == sorted(point)
    assert not record["inputs"]["given"].keys() & record["inputs"]["defaults"].keys()
    assert [entry["name"] for entry in record["cautions"]] == list(design.cautions())
    last = record["budget"][-1]["total"]["value"]
    assert last == record["outcome"]["rate_detected"]["value"] or isinstance(last, float)


def value_of_plain(value: Any, unit: str) -> float:
    """SI value of a number as a plain JSON reader sees it."""
    words = {"infinite": math.inf, "minus infinite": -math.inf, "none": math.nan}
    return words[value] if isinstance(value, str) else to_si(value, unit)


@tried(200)
@given(points())
def test_inputs_come_back_bit_for_bit_and_the_outcome_too(point: Point) -> None:
    check_round_trip(point)


@pytest.mark.slow
@tried(4000)
@given(points())
def test_inputs_come_back_bit_for_bit_often(point: Point) -> None:
    check_round_trip(point)


any_float = st.floats(allow_nan=False)


@pytest.mark.parametrize("unit", [unit for unit in EXPONENTS if unit != "°"])
@tried(60)
@given(value=any_float)
def test_every_float_comes_back_from_every_unit(unit: str, value: float) -> None:
    text = serialise({"value": number_in(value, unit)})
    back = value_of(parse(text.encode(), "x")["value"], unit)
    assert bits(back) == bits(value)


measured_rows = st.lists(
    st.tuples(st.floats(-60e-9, 300e-9), st.floats(0, 1e15)), min_size=2, max_size=8
)


@tried(60)
@given(measured_rows)
def test_measured_spectra_come_back_bit_for_bit(rows: list[tuple[float, float]]) -> None:
    rows = sorted(rows)
    close = any(after[0] - before[0] < 1e-20 for before, after in itertools.pairwise(rows))
    if close or not any(count for _, count in rows):
        return
    offsets, counts = zip(*rows, strict=True)
    check_round_trip({"spectrum": Samples(offsets, counts)})


def test_a_full_design_comes_back_whole(tmp_path: Path) -> None:
    design = full()
    save_design(design, tmp_path / "design.json")
    back = load_design(tmp_path / "design.json")
    assert back == design
    assert hash(back) == hash(design)
    for name, value in design.point.items():
        assert_same_bits(back.point[name], value)
    save_design(back, tmp_path / "again.json")
    first, second = (
        json.loads((tmp_path / name).read_text()) for name in ("design.json", "again.json")
    )
    del first["saved"], second["saved"]
    assert first == second


def test_a_bare_point_can_be_saved(tmp_path: Path) -> None:
    save_design({"lifetime": 3e-9}, tmp_path / "point.json")
    assert load_design(str(tmp_path / "point.json")) == Design({"lifetime": 3e-9})


@pytest.mark.parametrize(
    ("name", "kind"),
    [(name, kind) for name, row in INPUTS.items() if not row.whole for kind in kinds_for(name)],
)
def test_scatter_and_unknowns_of_every_input(name: str, kind: str) -> None:
    entry = INPUTS[name]
    low, high = entry.slider[0], (entry.slider[0] + entry.slider[1]) / 3
    point = {"emission_wavelength": 2e-6} if name != "emission_wavelength" else {}
    design = Design(
        point,
        scatter={name: Spread(kind, 0.123456789e-3)},
        unknowns={name: Unknown(min(low, high), max(low, high))},
        origins={name: Origin(ORIGINS[len(name) % len(ORIGINS)], "a", "b")},
    )
    text = design_text(design)
    assert next(PLAIN.iter_errors(json.loads(text)), None) is None
    assert design_from(text.encode()) == design


# --- what a person and another program find in it -------------------------------------------------


def test_every_value_has_the_unit_that_the_page_shows() -> None:
    record = json.loads(design_text(full()))
    assert record["format"] == FORMAT
    assert record["version"] == VERSION
    assert record["tool"] == {"name": "explorer", "version": __version__}
    assert record["inputs"]["given"]["lifetime"] == {"value": 3.3, "unit": "ns"}
    assert record["inputs"]["defaults"]["emission_wavelength"] == {"value": 650, "unit": "nm"}
    assert record["inputs"]["defaults"]["resonance_wavelength"] == {"value": 650, "unit": "nm"}
    rows = record["inputs"]["given"]["spectrum"]["value"]
    assert rows["units"] == ["1", "nm", "nm"]
    assert rows["rows"] == [[0.6, 0.1, 2], [0.2, -9, 0], [0.1, 3, "fast_linewidth"]]
    for group in record["inputs"].values():
        for name, entry in group.items():
            assert INPUTS[name].whole or entry["unit"] == INPUTS[name].shown
    assert set(record["inputs"]["given"]) | set(record["inputs"]["defaults"]) == set(INPUTS)
    assert set(record["outcome"]) == set(QUANTITIES)
    for name, entry in record["outcome"].items():
        if QUANTITIES[name].kind == "number":
            assert entry["unit"] == QUANTITIES[name].unit
            assert entry["shown"]
    assert record["requirements"][0]["at_least"] == {"value": 2e7, "unit": "1/s"}
    assert record["unknowns"]["axial_offset"]["low"] == {"value": -10, "unit": "nm"}
    assert record["scatter"]["mode_volume"]["width"]["unit"] == "1"


def test_absent_means_default_so_a_reload_still_follows() -> None:
    back = design_from(design_text({"emission_wavelength": 700e-9}).encode())
    assert "resonance_wavelength" not in back.point
    moved = back.with_values(emission_wavelength=800e-9)
    assert evaluate(moved.point, ["resonance_wavelength"])["resonance_wavelength"] == 800e-9


def test_infinity_and_no_number_are_words() -> None:
    void = {
        "mode_volume": 1e-8,
        "lifetime": 1e-12,
        "bulk_rate_ratio": 900.0,
        "filter_width": math.inf,
    }
    text = design_text(void)
    record = json.loads(text, parse_constant=pytest.fail)
    assert record["inputs"]["given"]["filter_width"] == {"value": "infinite", "unit": "nm"}
    assert record["outcome"]["rate_detected"]["value"] == "none"
    assert record["outcome"]["rate_detected"]["shown"] == "no number"
    assert record["outcome"]["regime"]["value"] == ""
    assert record["budget"][-1]["total"]["value"] == "none"
    assert "coupling_beyond_model" in {entry["name"] for entry in record["cautions"]}
    assert design_from(text.encode()) == Design(void)
    for word in ("NaN", "Infinity"):
        assert word not in text


def test_cautions_carry_their_sentences() -> None:
    record = json.loads(design_text({"quality_factor": 3.0}))
    found = {entry["name"]: entry["sentence"] for entry in record["cautions"]}
    assert found["low_quality"] == CAUTIONS["low_quality"].sentence


def test_sources_are_named() -> None:
    record = json.loads(design_text(full()))
    used = {quantity.source for quantity in QUANTITIES.values()} - {"definition"}
    assert used <= set(record["sources"])
    assert "Purcell" in record["sources"]["purcell1946"]


def test_texts_with_script_stay_text(tmp_path: Path) -> None:
    design = Design(
        name=SCRIPT,
        note=SCRIPT,
        decision=Decision(SCRIPT, SCRIPT, SCRIPT),
        origins={"lifetime": Origin("typed", SCRIPT, SCRIPT)},
        emitter=SCRIPT,
        data={SCRIPT: SCRIPT},
    )
    save_design(design, tmp_path / "design.json")
    back = load_design(tmp_path / "design.json")
    assert back == design
    assert back.note == SCRIPT


@tried(100)
@given(st.text(alphabet=st.characters(exclude_categories=("Cs", "Cc")), max_size=60))
def test_any_text_comes_back(text: str) -> None:
    design = Design(name=text, note=text + "\n", decision=Decision(text, text, text))
    assert design_from(design_text(design).encode()) == design


def test_a_text_that_looks_like_a_number_of_ours_stays_text() -> None:
    design = Design(name='number:5 "\\u0000number:5"', note="number:1e999")
    assert design_from(design_text(design).encode()) == design


# --- the schema -----------------------------------------------------------------------------------


def test_the_schema_is_one() -> None:
    Draft202012Validator.check_schema(schema())
    assert schema()["$schema"] == "https://json-schema.org/draft/2020-12/schema"


def test_the_shipped_schema_is_the_one_in_use() -> None:
    assert shipped() == schema()


def test_the_schema_lets_nothing_unknown_in() -> None:
    record = json.loads(design_text(full()))
    for place in (record, record["inputs"]["given"], record["decision"], record["outcome"]):
        place["extra"] = 1
        assert next(PLAIN.iter_errors(record), None) is not None
        del place["extra"]
    assert next(PLAIN.iter_errors(record), None) is None


@pytest.mark.parametrize("slot", ["ranges", "yield", "headroom", "measured", "bounds", "shown"])
def test_later_slots_exist(slot: str) -> None:
    assert slot in schema()["properties"]
    assert slot not in schema()["required"]


def test_other_units_of_the_same_kind_are_read() -> None:
    record = json.loads(design_text({"lifetime": 3e-9, "filter_width": 2e-9}))
    record["inputs"]["given"]["lifetime"] = {"value": 4500, "unit": "ps"}
    record["inputs"]["given"]["filter_width"] = {"value": 0.1, "unit": "µm"}
    back = design_from(json.dumps(record).encode())
    assert back.point == {"lifetime": 4.5e-9, "filter_width": 1e-7}


@pytest.mark.parametrize("unit", ["°", "deg", "rad", "mrad"])
def test_a_required_angle_may_be_in_degrees(unit: str) -> None:
    figure = {"rad": 0.7, "mrad": 700}.get(unit, 40)
    asked = Requirement("half_angle", at_most=math.radians(40) if figure == 40 else 0.7)
    record = json.loads(design_text(Design(requirements=(asked,))))
    assert record["requirements"][0]["at_most"]["unit"] == "rad"
    record["requirements"][0]["at_most"] = {"value": figure, "unit": unit}
    assert next(PLAIN.iter_errors(record), None) is None
    back = design_from(json.dumps(record).encode())
    assert back.requirements[0].limit == pytest.approx(asked.limit, rel=1e-15)


def test_a_required_share_may_be_in_per_cent() -> None:
    record = json.loads(design_text(Design(requirements=(Requirement("g2_zero", at_most=0.1),))))
    record["requirements"][0]["at_most"] = {"value": 2.5, "unit": "%"}
    assert design_from(json.dumps(record).encode()).requirements[0].limit == 0.025


def test_a_mark_at_the_start_of_the_file_is_no_harm() -> None:
    text = design_text({"lifetime": 3e-9})
    assert design_from(b"\xef\xbb\xbf" + text.encode()) == Design({"lifetime": 3e-9})
    assert design_from(text.replace("\n", "\r\n").encode()) == Design({"lifetime": 3e-9})


def test_the_outcome_is_worked_out_afresh() -> None:
    record = json.loads(design_text({"lifetime": 3e-9}))
    record["outcome"]["rate_detected"]["value"] = 1e99
    assert design_from(json.dumps(record).encode()) == Design({"lifetime": 3e-9})


# --- whole or not at all --------------------------------------------------------------------------


def failing(number: int) -> Any:
    def fail(*_: Any, **__: Any) -> None:
        raise OSError(number, os.strerror(number))

    return fail


@pytest.mark.parametrize(
    ("call", "before"),
    [
        ("replace", True),
        ("replace", False),
        ("fsync", True),
        ("fsync", False),
        ("chmod", True),  # a new file has its rights from the start
    ],
)
@pytest.mark.parametrize("number", [errno.ENOSPC, errno.EIO, errno.EROFS])
def test_an_interrupted_write_leaves_the_old_file(
    call: str, number: int, before: bool, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    target = tmp_path / "design.json"
    if before:
        save_design({"lifetime": 1e-9}, target)
    old = target.read_bytes() if before else None
    monkeypatch.setattr(os, call, failing(number))
    with pytest.raises(RecordError, match=r"design\.json") as caught:
        save_design({"lifetime": 2e-9}, target)
    assert os.strerror(number) in str(caught.value)
    assert "\n" not in str(caught.value)
    monkeypatch.undo()
    assert [file.name for file in tmp_path.iterdir()] == (["design.json"] if before else [])
    if before:
        assert target.read_bytes() == old
        assert load_design(target).point["lifetime"] == 1e-9


def test_a_full_disk_while_writing(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """/dev/full takes no byte: as a disk that fills up during the write."""
    target = tmp_path / "design.json"
    save_design({"lifetime": 1e-9}, target)
    opened = os.fdopen

    def onto_full_disk(handle: int, *more: Any, **named: Any) -> Any:
        os.close(handle)
        return opened(os.open("/dev/full", os.O_WRONLY), *more, **named)

    if not Path("/dev/full").exists():
        pytest.skip("this system has no /dev/full")
    monkeypatch.setattr(os, "fdopen", onto_full_disk)
    with pytest.raises(RecordError, match=os.strerror(errno.ENOSPC)):
        save_design({"lifetime": 2e-9}, target)
    monkeypatch.undo()
    assert [file.name for file in tmp_path.iterdir()] == ["design.json"]
    assert load_design(target).point["lifetime"] == 1e-9


def test_a_stop_by_the_keyboard_leaves_the_old_file(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    target = tmp_path / "design.json"
    save_design({"lifetime": 1e-9}, target)

    def stop(*_: Any) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(os, "fsync", stop)
    with pytest.raises(KeyboardInterrupt):
        save_design({"lifetime": 2e-9}, target)
    monkeypatch.undo()
    assert [file.name for file in tmp_path.iterdir()] == ["design.json"]
    assert load_design(target).point["lifetime"] == 1e-9


def test_a_folder_that_may_not_be_written(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    folder = tmp_path / "kept"
    folder.mkdir()
    save_design({"lifetime": 1e-9}, folder / "design.json")
    folder.chmod(0o500)
    try:
        if os.access(folder, os.W_OK):  # the superuser may write anywhere: let the system refuse
            monkeypatch.setattr(os, "open", failing(errno.EACCES))
        with pytest.raises(RecordError, match=r"design\.json.*Permission denied"):
            save_design({"lifetime": 2e-9}, folder / "design.json")
    finally:
        folder.chmod(0o700)
    assert load_design(folder / "design.json").point["lifetime"] == 1e-9
    assert [file.name for file in folder.iterdir()] == ["design.json"]


def test_a_bad_point_touches_no_file(tmp_path: Path) -> None:
    target = tmp_path / "design.json"
    target.write_text("precious")
    with pytest.raises(InputError):
        save_design({"lifetime": -1.0}, target)
    assert target.read_text() == "precious"


@pytest.mark.parametrize("mask", [0o022, 0o077, 0o002])
def test_a_new_file_has_the_rights_that_the_mask_leaves(mask: int, tmp_path: Path) -> None:
    target = tmp_path / "design.json"
    before = os.umask(mask)
    try:
        save_design({}, target)
    finally:
        os.umask(before)
    assert target.stat().st_mode & 0o777 == 0o666 & ~mask


@pytest.mark.parametrize("rights", [0o600, 0o664, 0o444])
def test_rights_of_a_file_are_kept(rights: int, tmp_path: Path) -> None:
    target = tmp_path / "design.json"
    save_design({}, target)
    target.chmod(rights)
    save_design({"lifetime": 1e-9}, target)
    assert target.stat().st_mode & 0o777 == rights
    assert load_design(target).point == {"lifetime": 1e-9}


def test_a_link_stays_a_link(tmp_path: Path) -> None:
    folder = tmp_path / "kept"
    folder.mkdir()
    target, link, chain = folder / "design.json", tmp_path / "link.json", tmp_path / "chain.json"
    link.symlink_to(target)
    chain.symlink_to("link.json")
    for number, path in enumerate((link, target, chain), start=1):  # at first to what is not there
        save_design({"lifetime": number * 1e-9}, path)
        assert load_design(target).point == {"lifetime": number * 1e-9}
    assert link.is_symlink()
    assert chain.is_symlink()
    assert not target.is_symlink()
    assert [file.name for file in folder.iterdir()] == ["design.json"]
    assert len(list(tmp_path.iterdir())) == 3


def test_a_link_to_itself_is_not_written(tmp_path: Path) -> None:
    link = tmp_path / "design.json"
    link.symlink_to(link)
    with pytest.raises(RecordError, match=r"design\.json"):
        save_design({}, link)
    assert link.is_symlink()
    assert len(list(tmp_path.iterdir())) == 1


def test_two_writers_never_leave_half_a_file(tmp_path: Path) -> None:
    """Readers see one design or the other, whole, while another process writes."""
    target = tmp_path / "design.json"
    save_design({"lifetime": 1e-9}, target)
    code = (
        "import sys\nfrom explorer import save_design\n"
        "for number in range(40):\n    save_design({'lifetime': (1 + number % 2) * 1e-9}, sys.argv[1])\n"
    )
    writer = subprocess.Popen([sys.executable, "-c", code, str(target)])
    seen = set()
    while writer.poll() is None:
        seen.add(load_design(target).point["lifetime"])
    assert writer.returncode == 0
    assert seen <= {1e-9, 2e-9}
    assert len(list(tmp_path.iterdir())) == 1
