"""What README prints is what the package says."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from explorer import catalogue
from explorer.page.forest import drawing, markdown
from explorer.prediction import predictions

ROOT = Path(__file__).resolve().parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")
WORDS = " ".join(README.split())


def write() -> None:
    """Write table and drawing anew: `python -c "from tests.test_readme import write; write()"`."""
    start, end = "<!-- predictions -->\n", "<!-- end of predictions -->"
    before, rest = README.split(start)
    after = rest.split(end)[1]
    text = f"{before}{start}{markdown(predictions())}{end}{after}"
    (ROOT / "README.md").write_text(text, encoding="utf-8")
    (ROOT / "docs" / "predictions.svg").write_text(drawing(predictions()), encoding="utf-8")


def test_the_table_of_predictions_is_the_present_one() -> None:
    assert markdown(predictions()) in README, write.__doc__


def test_the_drawing_of_predictions_is_the_present_one() -> None:
    drawn = (ROOT / "docs" / "predictions.svg").read_text(encoding="utf-8")
    assert drawn == drawing(predictions()), write.__doc__


def test_the_count_of_hits() -> None:
    measured = [row for row in predictions() if row.meaning.startswith("measured")]
    hits = sum(row.inside for row in measured)
    assert f"{hits} of the {len(measured)} measured enhancements lie inside" in WORDS


def test_the_size_of_the_catalogue_and_the_share_seen() -> None:
    emitters, resonators = catalogue.emitters().values(), catalogue.resonators().values()
    placed = [record for record in resonators if record.placed]
    assert (
        f"holds {len(emitters)} published emitters, {len(resonators)} resonators, {len(placed)} of "
        f"them with Q and V, and {len(catalogue.optics())} optics"
    ) in WORDS
    deciding = [v for one in (*emitters, *resonators) for v in one.deciding().values()]
    seen = sum(value.checked == "seen" for value in deciding)
    assert seen >= 0.4 * len(deciding)
    share = round(100 * seen / len(deciding))
    assert f"{seen} of {len(deciding)} were seen, {share} %" in WORDS


@pytest.mark.parametrize("picture", re.findall(r"\]\((docs/[^)]+)\)", README))
def test_every_picture_is_there(picture: str) -> None:
    assert (ROOT / picture).stat().st_size > 1000
