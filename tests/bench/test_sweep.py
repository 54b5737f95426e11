"""Prints how many rows a second sweeps write, and how much faster two workers are than one."""

from __future__ import annotations

import os
import statistics
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from explorer.scenario import first_question
from explorer.sweep import factorial, process_pool, sampled, sweep, sweep_to

pytestmark = pytest.mark.bench

DESIGN = first_question().design
WANTED = ("rate_in_fibre", "g2_zero", "half_angle", "regime")
ROUNDS = 5

#: A million rows of every combination, and an eighth of a million random ones.
GRID = factorial(
    DESIGN,
    pumping=["pulsed", "continuous"],
    quality_factor=np.geomspace(10, 1e4, 500),
    mode_volume=np.geomspace(0.01, 100, 1000),
)
DRAWN = sampled(
    DESIGN,
    2**17,
    1,
    {"quality_factor": (10, 1e4), "mode_volume": (0.01, 100), "fast_linewidth": (1e-9, 1e-7)},
)


def seconds(work: Callable[[], Any]) -> float:
    start = time.perf_counter()
    work()
    return time.perf_counter() - start


def test_rows_per_second(tmp_path: Path, capsys) -> None:
    works: dict[str, tuple[int, Callable[[], Any]]] = {}
    for title, plan in (("every combination", GRID), ("random rows", DRAWN)):
        for kind in ("csv", "parquet"):
            path = tmp_path / f"{title}.{kind}"

            def write(path: Path = path, plan: Any = plan) -> None:
                sweep_to(path, plan, WANTED, restart=True)

            works[f"{title}, {kind}"] = (plan.rows, write)

        def frame(plan: Any = plan) -> None:
            sweep(plan, WANTED)

        works[f"{title}, data frame"] = (plan.rows, frame)
    with capsys.disabled():
        print(f"\n{'one process':34}{'rows/s':>12}{'slowest':>12}")
        for title, (rows, work) in works.items():
            times = [seconds(work) for _ in range(ROUNDS)]
            print(f"{title:34}{rows / statistics.median(times):12,.0f}{rows / max(times):12,.0f}")
    sizes = {kind: _size(tmp_path / f"every combination.{kind}") for kind in ("csv", "parquet")}
    with capsys.disabled():
        print(
            ", ".join(f"{kind} {size / GRID.rows:.0f} bytes a row" for kind, size in sizes.items())
        )
    assert sizes["csv"] > 0


def _size(path: Path) -> int:
    return sum(file.stat().st_size for file in ([path] if path.is_file() else path.iterdir()))


@pytest.mark.parametrize(("title", "plan"), [("every combination", GRID), ("random rows", DRAWN)])
def test_two_workers(title: str, plan: Any, tmp_path: Path, capsys) -> None:
    """Pools of one and of two processes in turn, so that both see the same load of the machine."""
    times: dict[int, list[float]] = {1: [], 2: []}
    with process_pool(1) as one, process_pool(2) as two:
        for number in range(ROUNDS + 1):
            for workers, pool in ((1, one), (2, two)):
                path = tmp_path / f"{workers}.csv"

                def write(path: Path = path, pool: Any = pool) -> None:
                    sweep_to(path, plan, WANTED, pool, chunk=2**15, restart=True)

                taken = seconds(write)
                if number:  # the first ones warm up
                    times[workers].append(taken)
    assert (tmp_path / "1.csv").read_bytes() == (tmp_path / "2.csv").read_bytes()
    ratios = [first / second for first, second in zip(times[1], times[2], strict=True)]
    with capsys.disabled():
        rates = ", ".join(
            f"{workers}: {plan.rows / statistics.median(found):,.0f} rows/s"
            for workers, found in times.items()
        )
        load = f"load {os.getloadavg()[0]:.1f}, {os.cpu_count()} cores"
        print(
            f"\n{title}, workers {rates}; ratio {statistics.median(ratios):.2f} "
            f"({min(ratios):.2f} to {max(ratios):.2f}); wanted: 1.5 ({load})"
        )


def test_import(capsys) -> None:
    """What the modules of the sweeps themselves cost of `import explorer.sweep`."""
    command = [
        sys.executable,
        "-X",
        "importtime",
        "-c",
        "import explorer.sweep, sys; print(*sys.modules)",
    ]
    times = []
    for _ in range(ROUNDS):
        ended = subprocess.run(command, capture_output=True, text=True, check=True)
        lines = [line.split("|") for line in ended.stderr.splitlines() if "explorer.sweep" in line]
        times.append(sum(int(own.split(":")[1]) for own, _, _ in lines) / 1000)
    heavy = {"pandas", "pyarrow", "distributed", "multiprocessing.pool"} & set(ended.stdout.split())
    with capsys.disabled():
        print(f"\nimport explorer.sweep: {statistics.median(times):.1f} ms of its own")
    assert not heavy
