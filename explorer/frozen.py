"""A read-only mapping with a hash, for what designs are made of."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any


class Frozen(Mapping[str, Any]):
    """A read-only mapping with a hash, in the order it was given."""

    __slots__ = ("_entries", "_hash")

    def __init__(self, entries: Mapping[str, Any] | None = None) -> None:
        self._entries = dict(entries or {})
        self._hash = hash(frozenset(self._entries.items()))

    def __getitem__(self, key: str) -> Any:
        return self._entries[key]

    def __iter__(self) -> Iterator[str]:
        return iter(self._entries)

    def __len__(self) -> int:
        return len(self._entries)

    def __hash__(self) -> int:
        return self._hash

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Mapping) and self._entries == dict(other)

    def __repr__(self) -> str:
        return repr(self._entries)

    def __reduce__(self) -> tuple[Any, ...]:
        return Frozen, (self._entries,)

    def __or__(self, other: Mapping[str, Any]) -> Frozen:
        return Frozen({**self._entries, **other})
