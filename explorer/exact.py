"""JSON whose numbers are exact: decimals in the shown unit that return the same bits.

Writing shifts the exponent of the shortest decimal of the SI value and writes all its digits; reading
shifts back before the decimal becomes a binary number. ∞ is the word "infinite", not-a-number "none".
"""

from __future__ import annotations

import json
import math
import re
from decimal import Decimal
from typing import Any

from .units import EXPONENTS, unit_name

#: Deepest nesting of a record that is read.
DEEPEST = 40

_MARK = "\x00number:"
_MARKED = re.compile(r'"\\u0000number:([^"]*)"')

WORDS = {"infinite": math.inf, "minus infinite": -math.inf, "none": math.nan}


class RecordError(ValueError):
    """A record that cannot be read or written; the message says what is wrong in one sentence."""


def number_in(value: float, unit: str) -> str:
    """An SI number for `serialise`, in `unit`: a marked exact decimal, or a word."""
    number = float(value)
    if not math.isfinite(number):
        return "none" if math.isnan(number) else "infinite" if number > 0 else "minus infinite"
    exponent = EXPONENTS[unit_name(unit)][1]
    decimal = Decimal(repr(number)).scaleb(-exponent)
    size = decimal.adjusted() if decimal else 0
    plain = -5 <= size <= 15
    return _MARK + (format(decimal.normalize(), "f") if plain else format(decimal.normalize(), "e"))


def value_of(number: Any, unit: str) -> float:
    """SI value of a number read by `parse`, written in `unit`. Raises RecordError."""
    if isinstance(number, str):
        if number not in WORDS:
            raise RecordError(f"{number!r:.40} is no number")
        return WORDS[number]
    exponent = EXPONENTS[unit_name(unit)][1]
    decimal = Decimal(number)
    # Beyond any float, and beyond what a decimal can be shifted by.
    if decimal and abs(decimal.adjusted()) > 1000:
        return math.copysign(math.inf if decimal.adjusted() > 0 else 0.0, decimal)
    return float(decimal.scaleb(exponent))


def serialise(record: Any) -> str:
    """JSON text of a record whose numbers come from `number_in`."""
    text = json.dumps(record, ensure_ascii=False, indent=1, allow_nan=False)
    # json escapes the NUL of the mark; no text of a design may hold one, so nothing else matches.
    return _MARKED.sub(r"\1", _short_rows(text))


def _short_rows(text: str) -> str:
    """Rows of numbers on one line each."""
    row = re.compile(r'\[\s+((?:"\\u0000number:[^"]*",?\s*)+)\]')
    return row.sub(lambda found: "[" + " ".join(found.group(1).split()) + "]", text)


def _constant(word: str) -> Any:
    raise RecordError(f"it holds {word}, which is no JSON number")


def _pairs(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    found = dict(pairs)
    if len(found) != len(pairs):
        names = [name for name, _ in pairs]
        twice = next(name for name in names if names.count(name) > 1)
        raise RecordError(f"it gives {twice!r:.60} twice")
    return found


def _depth(text: str) -> int:
    """Deepest nesting of brackets outside strings, without recursion."""
    deepest = depth = 0
    for sign in re.sub(r'"(?:[^"\\]|\\.)*"|[^][{}"]+', "", text):
        if sign in "[{":
            depth += 1
            deepest = max(deepest, depth)
        elif sign in "]}":
            depth -= 1
    return deepest


def parse(content: bytes, name: str) -> Any:
    """The JSON value of a record, its numbers as decimals. Raises RecordError, one sentence."""
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise RecordError(f"{name} is no text: byte {error.start} is not UTF-8") from error
    if _depth(text) > DEEPEST:
        raise RecordError(f"{name} is nested deeper than the {DEEPEST} levels of a design record")
    try:
        return json.loads(
            text,
            parse_float=Decimal,
            parse_int=Decimal,
            parse_constant=_constant,
            object_pairs_hook=_pairs,
        )
    except json.JSONDecodeError as error:
        raise RecordError(
            f"{name} is not JSON: line {error.lineno}, column {error.colno}: {error.msg.lower()}"
        ) from error
    except RecordError as error:
        raise RecordError(f"{name} is not readable: {error}") from error
    except (ArithmeticError, ValueError) as error:
        raise RecordError(f"{name} holds a number that cannot be read") from error
