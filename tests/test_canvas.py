"""The map canvas without a browser: what is packed comes back, and the traits keep their word."""

import json
from collections.abc import Iterator
from dataclasses import FrozenInstanceError, replace

import numpy as np
import pytest
import traitlets

from explorer.page.canvas import (
    AxisScale,
    Band,
    ColourScale,
    Label,
    Line,
    MapCanvas,
    Mark,
    Picture,
    SecondScale,
    pack,
    unpack,
)

SHAPE = (5, 7)  # 35 cells: no whole number of bytes in a plane of bits


def a_picture(**changes: object) -> Picture:
    values = np.arange(35, dtype=float).reshape(SHAPE) + 1
    picture = Picture(
        values=values,
        x=AxisScale("Mode volume V", 1e-4, 1e3, "(λ/n)³", log=True),
        y=AxisScale("Quality factor Q", 10, 1e6, log=True),
        colour=ColourScale("Photons per second in the fibre", 1e4, 1e8, "1/s", log=True),
    )
    return replace(picture, **changes)


@pytest.fixture
def canvas() -> Iterator[MapCanvas]:
    widget = MapCanvas()
    yield widget
    widget.close()


def test_values_come_back_row_by_row_from_the_lowest_y() -> None:
    picture = a_picture()
    header, arrays = unpack(pack(picture))
    assert header["shape"] == list(SHAPE)
    np.testing.assert_array_equal(arrays["values"].reshape(SHAPE), picture.values)


def test_cells_without_a_number_stay_without_one() -> None:
    values = np.ones(SHAPE)
    values[2, 3] = np.nan
    _, arrays = unpack(pack(a_picture(values=values)))
    np.testing.assert_array_equal(np.isnan(arrays["values"].reshape(SHAPE)), np.isnan(values))


@pytest.mark.parametrize(
    "values", [np.ones(SHAPE).T, np.ones((10, 14))[::2, ::2], np.ones(SHAPE, int)]
)
def test_any_memory_order_and_type_is_sent_as_float32(values: np.ndarray) -> None:
    _, arrays = unpack(pack(a_picture(values=values)))
    assert arrays["values"].dtype == np.float32
    np.testing.assert_array_equal(arrays["values"].reshape(values.shape), values)


def test_every_caution_keeps_its_own_bit() -> None:
    cautioned = np.random.default_rng(1).integers(0, 256, SHAPE, dtype=np.uint8)
    holds = cautioned > 100
    _, arrays = unpack(pack(a_picture(cautioned=cautioned, holds=holds)))
    np.testing.assert_array_equal(arrays["cautioned"].reshape(SHAPE), cautioned)
    np.testing.assert_array_equal(arrays["holds"].reshape(SHAPE), holds)


def test_an_empty_mask_is_not_sent() -> None:
    _, arrays = unpack(pack(a_picture(cautioned=np.zeros(SHAPE, bool))))
    assert arrays.keys() == {"points", "starts", "values"}


def test_paths_come_back_line_by_line() -> None:
    first = np.array([[0, 0], [0.5, 1], [1, 1]])
    second = np.array([[0.25, 0.75], [0.5, 0.5]])
    lines = (
        Line("iso", (first, second), "1 M/s", 1e6),
        Line("outline", ()),
        Line("frontier", (second,), "strong coupling"),
    )
    header, arrays = unpack(pack(a_picture(lines=lines)))
    assert [line["kind"] for line in header["lines"]] == ["iso", "outline", "frontier"]
    assert header["lines"][0]["level"] == 1e6
    points = arrays["points"].reshape(-1, 2)
    for sent, line in zip(header["lines"], lines, strict=True):
        assert sent["text"] == line.text
        assert sent["count"] == len(line.paths)
        for k, path in enumerate(line.paths, start=sent["first"]):
            np.testing.assert_array_equal(
                points[arrays["starts"][k] : arrays["starts"][k + 1]], path
            )


def test_words_come_back_as_given() -> None:
    picture = a_picture(
        bands=(Band(0.1, 0.2, "nanocrystals, 298 K", own=True),),
        marks=(Mark(0.5, 0.4, "micropillar", "loaded Q as measured", "pillar"),),
        labels=(Label(0.3, 0.6, "20 M/s"),),
        top=SecondScale("beam half-angle", ((0.2, "80°"), (0.8, "2°"))),
        caution_texts=("Q below 5",),
        layers={"iso": False},
        ends_included=False,
    )
    header, _ = unpack(pack(picture))
    assert header["bands"] == [
        {"low": 0.1, "high": 0.2, "text": "nanocrystals, 298 K", "own": True}
    ]
    assert header["marks"][0]["key"] == "pillar"
    assert header["labels"] == [{"x": 0.3, "y": 0.6, "text": "20 M/s"}]
    assert header["top"] == {"label": "beam half-angle", "ticks": [[0.2, "80°"], [0.8, "2°"]]}
    assert header["right"] is None
    assert header["x"]["unit"] == "(λ/n)³"
    assert header["colour"]["log"] is True
    assert header["caution_texts"] == ["Q below 5"]
    assert header["layers"] == {"iso": False}
    assert header["ends_included"] is False


def test_numbers_may_be_numpy_scalars() -> None:
    band = Band(np.float32(0.25), np.float64(0.5), "dots, 4 K", own=np.bool_(True))
    header, _ = unpack(pack(a_picture(bands=(band,))))
    assert header["bands"] == [{"low": 0.25, "high": 0.5, "text": "dots, 4 K", "own": True}]


def test_arrays_are_aligned_for_the_browser() -> None:
    cautioned = np.ones(SHAPE, bool)
    for text in ("a", "ab", "abc", "abcd"):  # headers of every length modulo 4
        message = pack(a_picture(cautioned=cautioned, labels=(Label(0, 0, text),)))
        size = int.from_bytes(message[:4], "little")
        assert size % 4 == 0
        offsets = [offset for _, offset, _ in json.loads(message[4 : 4 + size])["arrays"].values()]
        assert all(offset % 4 == 0 for offset in offsets)


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"values": np.ones(4)}, "must have the shape"),
        ({"values": np.ones((0, 3))}, "must have the shape"),
        ({"holds": np.ones((7, 5), bool)}, "holds has the shape"),
        ({"cautioned": np.ones((5, 6), bool)}, "cautioned has the shape"),
        ({"labels": (Label(float("nan"), 0, "nowhere"),)}, "JSON"),
    ],
)
def test_what_the_browser_could_not_draw_is_refused(
    changes: dict[str, object], message: str
) -> None:
    with pytest.raises(ValueError, match=message):
        pack(a_picture(**changes))


def test_a_picture_is_frozen() -> None:
    with pytest.raises(FrozenInstanceError):
        a_picture().ends_included = False


def test_show_sends_once_and_an_equal_picture_not_at_all(canvas: MapCanvas) -> None:
    sent = []
    canvas.observe(lambda change: sent.append(change["new"]), "packed")
    canvas.show(a_picture())
    canvas.show(a_picture())
    assert sent == [pack(a_picture())]


@pytest.mark.parametrize("point", [[0.1], [0.1, 0.2, 0.3], [0.1, float("nan")], [float("inf"), 0]])
def test_a_point_is_two_finite_fractions(canvas: MapCanvas, point: list[float]) -> None:
    with pytest.raises(traitlets.TraitError):
        canvas.point = point


def test_a_point_may_lie_outside_the_map(canvas: MapCanvas) -> None:
    canvas.point = [-0.2, 1.5]
    assert canvas.point == [-0.2, 1.5]


def test_a_move_is_reported_done_after_its_handlers(canvas: MapCanvas) -> None:
    seen = []
    canvas.observe(lambda change: seen.append((change["new"], canvas.move_done)), "point")
    canvas.set_state({"point": [0.25, 0.75], "move_sent": 3})
    assert seen == [([0.25, 0.75], 0)]
    assert canvas.move_done == 3


def test_a_failing_handler_does_not_leave_the_ring_waiting(canvas: MapCanvas) -> None:
    def fail(_change: object) -> None:
        raise RuntimeError("no answer")

    canvas.observe(fail, "point")
    with pytest.raises(RuntimeError):
        canvas.set_state({"point": [0.25, 0.75], "move_sent": 4})
    assert canvas.move_done == 4


def test_a_clicked_mark_reaches_its_handlers(canvas: MapCanvas) -> None:
    keys: list[str] = []
    canvas.on_mark(keys.append)
    canvas._handle_custom_msg({"kind": "mark", "key": "pillar"}, [])
    canvas._handle_custom_msg({"kind": "something else"}, [])
    assert keys == ["pillar"]


def test_the_front_end_loads_nothing_from_outside() -> None:
    source = str(MapCanvas._esm)
    assert "export default { render }" in source
    for word in ("http:", "https:", "import ", "import(", "innerHTML", "fetch("):
        assert word not in source
