"""Prints how quickly the page follows; says nothing about what is quick enough."""

import pytest

from .latency import measure, report


@pytest.mark.bench
@pytest.mark.browser
def test_the_page_follows_a_hand(start_server, tmp_path, capsys) -> None:
    found = measure(start_server, tmp_path)
    with capsys.disabled():
        print(f"\n{report(found)}")
    assert all(kind.times for kind in found.values())
