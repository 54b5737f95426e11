"""How fast and how large a map of the devices that pass is: figures of one run, nothing asserted about time.

96×96 cells, 2048 devices in each, five inputs that scatter, four requirements, two threads: in units
of one pass of `np.exp` over as many numbers, and against the same arithmetic in plain NumPy.
"""

from __future__ import annotations

import json
import math
import os
import statistics
import subprocess
import sys
import time
from collections.abc import Callable
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from explorer import Axis, Requirement, Spread, make_map, make_yield_map, mesh
from explorer.evaluate import Evaluation
from explorer.inputs import INPUTS
from explorer.sampling import displaced, draws
from explorer.scenario import first_question
from explorer.yield_maps import yield_map_steps
from explorer.yields import PASSING

pytestmark = pytest.mark.bench

SIDE, COUNT, THREADS = 96, 2048, 2
CASES = {"slow width 0": 0.0, "slow width 5 nm": 5e-9}
DESIGN = first_question().design
SCATTER = {
    "lateral_offset": Spread("radial", 40e-9),
    "mode_volume": Spread("lognormal", 0.2),
    "resonance_wavelength": Spread("normal", 5e-9),
    "quality_factor": Spread("lognormal", 0.2),
    "upward_share": Spread("normal", 0.05),
}
WANTED = (
    Requirement("rate_in_fibre", at_least=20e6),
    Requirement("g2_zero", at_most=0.1),
    Requirement("half_angle", at_most=math.radians(40.0)),
    Requirement("collected_share", at_least=0.5),
)
AXES = (Axis("mode_volume", 1e-4, 1e3, count=SIDE), Axis("quality_factor", 3, 1e6, count=SIDE))

#: Draws of the plain way at once, so that its temporaries fit some 8 GB, and how many are measured.
SLABS = {"as it broadcasts": (256, 512), "every number in full": (64, 64)}

ROUNDS = 5


def median(run: Callable[[], Any], count: int = ROUNDS) -> float:
    """Median time of a call [s], after one that is not counted."""
    run()
    times = []
    for _ in range(count):
        start = time.perf_counter()
        run()
        times.append(time.perf_counter() - start)
    return statistics.median(times)


def point_of(slow: float) -> dict[str, Any]:
    return {**DESIGN.point, "slow_linewidth": slow}


def drawn_map(slow: float, threads: int = THREADS) -> Any:
    return make_yield_map(point_of(slow), *AXES, SCATTER, WANTED, COUNT, threads=threads).values[
        PASSING
    ]


def exponentials() -> None:
    """One pass of `np.exp` over all cells and devices, in blocks that fit the cache."""
    block = np.random.default_rng(0).random(65_536)
    for _ in range(SIDE * SIDE * COUNT // block.size):
        np.exp(block)


def plain(slow: float, way: str) -> Any:
    """The plain way for some of the devices: who passes of them, in each cell."""
    slab, measured = SLABS[way]
    drawn = draws(SCATTER, COUNT)
    point = {**point_of(slow), **mesh(*AXES)}
    passes: Any = 0
    for first in range(0, measured, slab):
        many = displaced(drawn, point, slice(first, first + slab))
        if way == "every number in full":
            many = expanded(many, (slab, SIDE, SIDE))
        work = Evaluation(many)
        met = [entry.met(np.asarray(work.result(entry.quantity))) for entry in WANTED]
        passes = passes + np.logical_and.reduce(np.broadcast_arrays(*met)).sum(axis=0)
    return passes


def expanded(point: dict[str, Any], shape: tuple[int, ...]) -> dict[str, Any]:
    """Every number that scatters or lies along an axis as a full array."""
    return {
        name: value
        if INPUTS[name].whole or np.ndim(value) == 0
        else np.ascontiguousarray(np.broadcast_to(value, shape))
        for name, value in point.items()
    }


def timed(works: dict[str, tuple[Callable[[], Any], float]]) -> dict[str, tuple[float, float]]:
    """Median and shortest time of each work [s], taken in turn, so that all see the same load.

    works: name -> the work and by what its time is to be multiplied.
    """
    times: dict[str, list[float]] = {name: [] for name in works}
    for number in range(ROUNDS + 1):
        for name, (work, factor) in works.items():
            start = time.perf_counter()
            work()
            if number > 0:  # the first one warms up
                times[name].append(factor * (time.perf_counter() - start))
    return {name: (statistics.median(found), min(found)) for name, found in times.items()}


@pytest.mark.parametrize("case", CASES)
def test_a_yield_map(case: str, capsys: Any) -> None:
    slow = CASES[case]
    ours, one = f"{THREADS} threads", "one np.exp pass"
    works: dict[str, tuple[Callable[[], Any], float]] = {
        one: (exponentials, 1.0),
        ours: (partial(drawn_map, slow), 1.0),
        "1 thread": (partial(drawn_map, slow, 1), 1.0),
    }
    for way, (_, measured) in SLABS.items():
        works[f"plain NumPy, {way}"] = (partial(plain, slow, way), COUNT / measured)
    found = timed(works)
    with capsys.disabled():
        print(f"\n{case}, load {os.getloadavg()[0]:.1f}, median and shortest of {ROUNDS}")
        print(f"{'':36}{'s':>16}{'np.exp passes':>18}{'over ours':>16}")
        for name, (middle, best) in found.items():
            passes = (middle / found[one][0], best / found[one][1])
            over = (middle / found[ours][0], best / found[ours][1])
            print(
                f"{name:36}{middle:8.2f}{best:8.2f}{passes[0]:10.0f}{passes[1]:8.0f}"
                f"{over[0]:8.1f}{over[1]:8.1f}"
            )
        print(f"plain NumPy is scaled from parts, (slab, devices): {SLABS} of {COUNT}")
        print("wanted: 25 passes without and 70 with slow width, plain NumPy 2.5 times ours")
    expected = plain(slow, "every number in full")
    again = make_yield_map(point_of(slow), *AXES, SCATTER, WANTED, COUNT).values[PASSING]
    assert 0 < expected.sum() < SLABS["every number in full"][1] * SIDE**2
    assert np.array_equal(again, drawn_map(slow))


@pytest.mark.parametrize("case", CASES)
def test_the_way_to_a_yield_map(case: str, capsys: Any) -> None:
    """The first coarse map against one redraw of a plain map, and the longest wait for a step."""
    slow = CASES[case]
    x, y = (Axis(axis.name, axis.low, axis.high, count=256) for axis in AXES)
    redraw = median(
        lambda: make_map(point_of(slow), x, y, ("rate_in_fibre",), WANTED), 2 * ROUNDS + 1
    )

    def steps(count: int) -> Any:
        return yield_map_steps(point_of(slow), *AXES, SCATTER, WANTED, count)

    def first_map() -> None:
        next(drawn for _, drawn in steps(COUNT) if drawn is not None)

    coarse = median(first_map, 2 * ROUNDS + 1)
    waits = []
    last = time.perf_counter()
    for _ in steps(COUNT):
        waits.append(time.perf_counter() - last)
        last = time.perf_counter()
    with capsys.disabled():
        print(
            f"\nload {os.getloadavg()[0]:.1f}; {case}: first map {coarse * 1e3:.0f} ms, "
            f"{coarse / redraw:.1f} redraws of a 256×256 map ({redraw * 1e3:.0f} ms; wanted: 3); "
            f"longest of {len(waits)} steps {max(waits) * 1e3:.0f} ms, "
            f"median {statistics.median(waits) * 1e3:.0f} ms"
        )
    assert len(waits) > 100


def peak() -> int:
    """Most memory that this process ever held [kB]; `ru_maxrss` would count its parent's too."""
    status = Path("/proc/self/status")
    if not status.exists():
        import resource

        return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    row = next(line for line in status.read_text().splitlines() if line.startswith("VmHWM"))
    return int(row.split()[1])


CHILD = """
import json, sys
sys.path.insert(0, {root!r})
from tests.bench.test_yields import CASES, AXES, SCATTER, WANTED, drawn_map, peak, point_of
from explorer import make_yield_map
from dataclasses import replace
slow = CASES[{case!r}]
axes = [replace(axis, count=8) for axis in AXES]
make_yield_map(point_of(slow), *axes, SCATTER, WANTED, 16, threads=2)  # loads what is loaded late
before = peak()
drawn_map(slow)
print(json.dumps([before, peak()]))
"""


@pytest.mark.parametrize("case", CASES)
def test_the_memory_of_a_yield_map(case: str, capsys: Any) -> None:
    """Peak of a process of its own, above what it takes to have loaded everything."""
    root = str(Path(__file__).resolve().parents[2])
    code = CHILD.format(root=root, case=case)
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True, cwd=root
    )
    before, after = json.loads(done.stdout)
    with capsys.disabled():
        print(
            f"\n{case}: {(after - before) / 1024:.0f} MB above {before / 1024:.0f} MB (wanted: 400)"
        )
    assert after > before
