"""Chunks of a table as Parquet files; needs pyarrow."""

from __future__ import annotations

from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq

from ..inputs import INPUTS
from .blocks import Block, Chunk
from .rows import Worked, kind_of, work_out
from .texts import REFUSED, number_texts, power_of, title


def parquet_rows(chunk: Chunk, wanted: tuple[str, ...]) -> tuple[bytes, int, str]:
    """A chunk as the bytes of a file, how many rows are refused, and the reason of the first."""
    tables = []
    refused, reason = 0, ""
    for block in chunk:
        worked = work_out(block, wanted)
        tables.append(_table(block, worked, wanted))
        refused, reason = refused + worked.refused, reason or worked.reason
    sink = pa.BufferOutputStream()
    pq.write_table(pa.concat_tables(tables), sink)
    return sink.getvalue().to_pybytes(), refused, reason


def _table(block: Block, worked: Worked, wanted: tuple[str, ...]) -> Any:
    """The rows of a block, titled as in a text file; truth values are missing where refused."""
    columns: dict[str, Any] = {
        (title(name) if name in INPUTS else name): pa.repeat(pa.scalar(label), block.rows)
        for name, label in block.labels
    }
    for name in block.names:
        columns[title(name)] = pa.array(_full(_shown(name, worked.columns[name]), worked))
    for name in wanted:
        answer, kind = worked.found[name], kind_of(name)
        if kind == "choice":
            column = pa.array(_full(answer, worked).tolist(), pa.string())
        elif kind == "mask":
            column = pa.array(_full(answer, worked), pa.bool_(), mask=_full(worked.bad, worked))
        else:
            column = pa.array(_full(_shown(name, answer), worked), pa.float64())
        columns[title(name)] = column
    columns[REFUSED] = pa.array(_full(worked.culprit, worked).tolist(), pa.string())
    return pa.table(columns)


def _full(value: Any, worked: Worked) -> Any:
    return np.ascontiguousarray(np.broadcast_to(value, worked.shape)).ravel()


def _shown(name: str, values: Any) -> Any:
    """Numbers in the unit of their column; SI for quantities."""
    if not power_of(name):
        return values
    texts = number_texts(values, name)
    return np.array([float(text or "nan") for text in texts]).reshape(np.shape(values))
