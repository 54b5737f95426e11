"""The table without a browser: what is packed, what is refused, and whose keys are handed on."""

import json
from collections.abc import Iterator
from dataclasses import FrozenInstanceError
from typing import Any

import numpy as np
import pytest

from explorer.page.table import BLANK, Cell, Column, Row, Table, pack

COLUMNS = (
    Column("emitter", "Emitter"),
    Column("rate", "Photons per second", "number", "after every loss", first_descending=True),
    Column("holds", "Rate", "pass", width=50),
)


def a_row(key: str, rate: float | None = 1.0, **changes: Any) -> Row:
    cells = (Cell(f"dot {key}", key), Cell(f"{rate} M/s", rate, "of pulses"), Cell("", True))
    return Row(key, changes.pop("cells", cells), **changes)


ROWS = (a_row("a", 3.0, tone="met"), a_row("b", None), a_row("c", 2.0, tone="quiet"))


def unpack(message: bytes) -> tuple[dict[str, Any], np.ndarray]:
    """Header and ranks, a row for each column."""
    start = 4 + int.from_bytes(message[:4], "little")
    header = json.loads(message[4:start])
    kind, offset, count = header["arrays"]["ranks"]
    assert kind == "uint32"
    ranks = np.frombuffer(message, "<u4", count, start + offset)
    return header, ranks.reshape(len(header["columns"]), -1)


def ranks_of(*values: float | str | None) -> list[int]:
    rows = [Row(f"row {k}", (Cell("", value),)) for k, value in enumerate(values)]
    _, ranks = unpack(pack([Column("one", "One")], rows, ""))
    return ranks[0].tolist()


@pytest.fixture
def table() -> Iterator[Table]:
    widget = Table()
    yield widget
    widget.close()


@pytest.fixture
def heard(table: Table) -> list[tuple[str, str]]:
    """What the handlers of a table with the three rows are called with."""
    calls: list[tuple[str, str]] = []
    table.on_pick(lambda key: calls.append(("pick", key)))
    table.on_keep(lambda key: calls.append(("keep", key)))
    table.show(COLUMNS, ROWS, "Candidates")
    return calls


def test_words_come_back_as_given() -> None:
    header, _ = unpack(pack(COLUMNS, ROWS, "Three candidates"))
    assert header["description"] == "Three candidates"
    assert header["keys"] == ["a", "b", "c"]
    assert header["tones"] == ["met", "", "quiet"]
    emitter, rate, holds = header["columns"]
    assert emitter["texts"] == ["dot a", "dot b", "dot c"]
    assert rate["texts"] == ["3.0 M/s", "None M/s", "2.0 M/s"]
    assert (rate["label"], rate["tooltip"]) == ("Photons per second", "after every loss")
    assert (rate["first_descending"], emitter["first_descending"]) == (True, False)
    assert (emitter["width"], holds["width"]) == (None, 50)


def test_titles_are_sent_where_there_are_any() -> None:
    header, _ = unpack(pack(COLUMNS, ROWS, ""))
    assert [column["titles"] for column in header["columns"]] == [None, ["of pulses"] * 3, None]


def test_marks_stand_for_true_false_and_not_known() -> None:
    rows = [
        Row(str(k), (Cell("", value),))
        for k, value in enumerate((True, False, None, float("nan"), 1.0, 0.0, np.True_))
    ]
    header, _ = unpack(pack([Column("holds", "Rate", "pass")], rows, ""))
    assert header["columns"][0]["marks"] == "✓✗––✓✗✓"


def test_numbers_are_ranked_by_value_and_blanks_have_no_rank() -> None:
    nan, inf = float("nan"), float("inf")
    assert ranks_of(2.5, None, -1, nan, 2.5, inf, np.float64(0)) == [2, BLANK, 0, BLANK, 2, 3, 1]


def test_words_are_ranked_as_a_person_reads() -> None:
    words = ("NA 0.9", "na 0.65", "NA 1.3", "NA 10", "dot", None, "NA 0.9")
    assert ranks_of(*words) == [2, 1, 3, 4, 0, BLANK, 2]


def test_numbers_come_before_words() -> None:
    assert ranks_of("none", 1e9, None, 3) == [2, 1, BLANK, 0]


def test_a_word_of_digits_is_a_word() -> None:
    assert ranks_of("nan", "10", "9") == [2, 1, 0]


def test_a_table_may_have_no_rows() -> None:
    header, ranks = unpack(pack(COLUMNS, (), "nothing"))
    assert header["keys"] == []
    assert ranks.shape == (3, 0)


@pytest.mark.parametrize(
    ("columns", "rows", "message"),
    [
        ((), (), "needs a column"),
        ((COLUMNS[0], COLUMNS[0]), (), "two columns .* same key"),
        (COLUMNS, (ROWS[0], ROWS[0]), "two rows .* same key"),
        (COLUMNS, (a_row(""),), "every row's key"),
        (COLUMNS, (a_row(3),), "every row's key"),
        ((Column("rate", "Rate", "date"),), (), "kind is one of"),
        (COLUMNS, (a_row("a", tone="red"),), "tone is one of"),
        (COLUMNS, (a_row("a", cells=(Cell("dot", 1),)),), "row 'a' has 1 cells, not 3"),
    ],
)
def test_what_does_not_fit_together_is_refused(
    table: Table, columns: tuple[Column, ...], rows: tuple[Row, ...], message: str
) -> None:
    table.show(COLUMNS, ROWS, "Candidates")
    before = table.packed
    with pytest.raises(ValueError, match=message):
        table.show(columns, rows, "")
    assert table.packed == before


def test_a_column_is_frozen() -> None:
    with pytest.raises(FrozenInstanceError):
        COLUMNS[0].label = "Emitters"


def test_show_sends_once_and_an_equal_table_not_at_all(table: Table) -> None:
    sent = []
    table.observe(lambda change: sent.append(change["new"]), "packed")
    table.show(COLUMNS, ROWS, "Candidates")
    table.show(list(COLUMNS), list(ROWS), "Candidates")
    assert sent == [pack(COLUMNS, ROWS, "Candidates")]
    table.show(COLUMNS, ROWS[:2], "Candidates")
    assert len(sent) == 2


@pytest.mark.parametrize("kind", ["pick", "keep"])
def test_a_present_key_reaches_the_handlers(
    table: Table, heard: list[tuple[str, str]], kind: str
) -> None:
    table._handle_custom_msg({"kind": kind, "key": "b"}, [])
    assert heard == [(kind, "b")]


@pytest.mark.parametrize(
    "content",
    [
        {"kind": "pick", "key": "d"},
        {"kind": "pick", "key": ""},
        {"kind": "pick", "key": 0},
        {"kind": "pick", "key": ["a"]},
        {"kind": "pick", "key": None},
        {"kind": "pick"},
        {"kind": "drop", "key": "a"},
        {"kind": ["pick"], "key": "a"},
        {"key": "a"},
        {},
        [],
        None,
        "pick",
    ],
)
def test_anything_else_from_the_browser_is_dropped(
    table: Table, heard: list[tuple[str, str]], content: object
) -> None:
    table._handle_custom_msg(content, [])
    assert heard == []


def test_a_key_of_rows_that_are_gone_is_dropped(table: Table, heard: list[tuple[str, str]]) -> None:
    table.show(COLUMNS, ROWS[:1], "Candidates")
    table._handle_custom_msg({"kind": "pick", "key": "c"}, [])
    assert heard == []


def test_a_message_that_the_browser_writes_itself_makes_no_key_valid(
    table: Table, heard: list[tuple[str, str]]
) -> None:
    table.set_state({"current": "z", "packed": pack(COLUMNS, [a_row("z")], "")})
    table._handle_custom_msg({"kind": "pick", "key": "z"}, [])
    assert heard == []
