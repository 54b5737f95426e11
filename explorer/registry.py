"""The wiring: inputs, formulas and cautions by name. Knows no physics.

A formula is a function with keyword-only parameters; each parameter is the name of an input or of
another formula. `quantity` publishes a formula under its function's name, `part` keeps it internal,
`variant` adds another body for an existing name, chosen by a whole value (or by a width that is
exactly zero, a filter that is exactly absent), and `caution` publishes a boolean mask with a sentence.
"""

from __future__ import annotations

import inspect
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from functools import cache
from typing import Any, TypeVar

from . import units

Formula = Callable[..., Any]
Body = TypeVar("Body", bound=Formula)


@dataclass(frozen=True)
class Input:
    """One named input of a point.

    unit: SI unit of the value inside. shown: unit on the page and in records. default: a number, a
    whole value, or a function whose keyword-only parameters are inputs or formulas. low, high: the
    domain in SI (a number, or a function of other inputs); `low_open`, `high_open`: the end itself
    is not allowed; `infinite`: ∞ is allowed. choices: the words of a choice; `types`: the classes of
    another whole value. slider: lowest and highest slider position in SI. scale: 'linear', 'log',
    'log or zero' (a zero stop below the lowest), 'log or none' (a stop for ∞ above the highest), or
    'choice' of a whole value. meaning: one sentence.
    """

    name: str
    label: str
    symbol: str
    group: str
    meaning: str
    unit: str = "1"
    shown: str = "1"
    default: Any = None
    low: Any = -float("inf")
    high: Any = float("inf")
    low_open: bool = False
    high_open: bool = False
    infinite: bool = False
    slider: tuple[float, float] = (0.0, 1.0)
    scale: str = "linear"
    choices: tuple[str, ...] = ()
    types: tuple[type, ...] = ()
    typical: str = ""
    source: str = ""

    @property
    def whole(self) -> bool:
        """Whether this is a whole value: one per point, never an axis."""
        return bool(self.choices or self.types)


@dataclass(frozen=True)
class Node:
    """A formula under a name, with its variants; not necessarily public."""

    name: str
    bodies: tuple[tuple[Mapping[str, Any], Formula], ...]


@dataclass(frozen=True)
class Quantity:
    """A public formula. unit: SI unit ('1', 'rad', '1/s', …). kind: 'number', 'choice' or 'mask'.

    label and symbol are for people, source is a key of references.toml or 'definition', log says
    whether a colour scale is logarithmic by default, choices are the words of a choice, note says
    what a person should know beside the formula, which doc holds.
    """

    name: str
    unit: str
    label: str
    symbol: str
    source: str
    group: str
    log: bool
    kind: str
    choices: tuple[str, ...]
    note: str
    doc: str


@dataclass(frozen=True)
class Caution:
    """A boolean mask with a sentence. voids: formulas that have no number where it is true."""

    name: str
    sentence: str
    label: str
    about: tuple[str, ...]
    voids: tuple[str, ...]
    doc: str


@dataclass
class Registry:
    """Everything that has a name. There is one instance, filled at import and then only read."""

    inputs: dict[str, Input] = field(default_factory=dict)
    nodes: dict[str, Node] = field(default_factory=dict)
    quantities: dict[str, Quantity] = field(default_factory=dict)
    cautions: dict[str, Caution] = field(default_factory=dict)
    #: Shown like a quantity, but of many devices: no formula of a point gives it.
    collective: dict[str, Quantity] = field(default_factory=dict)
    views: dict[str, dict[str, str]] = field(default_factory=dict)

    def shown(self, name: str) -> Quantity:
        """What a name that can be shown stands for, of a point or of many devices; KeyError if none."""
        return self.collective[name] if name in self.collective else self.quantities[name]

    def add_node(self, name: str, when: Mapping[str, Any], body: Formula) -> None:
        """Put a body under a name; a second unconditional body for a name is a mistake."""
        known = self.nodes.get(name)
        bodies = known.bodies if known else ()
        if not when and any(not condition for condition, _ in bodies):
            raise TypeError(f"{name} is defined twice")
        # The unconditional body comes last; among conditional ones the stricter comes first.
        merged = sorted([*bodies, (dict(when), body)], key=lambda entry: -len(entry[0]))
        self.nodes[name] = Node(name, tuple(merged))


REGISTRY = Registry()


@cache
def parameters(body: Formula) -> tuple[str, ...]:
    """Names of a formula's keyword-only parameters; TypeError if it has any other kind."""
    found = inspect.signature(body).parameters.values()
    wrong = [item.name for item in found if item.kind is not inspect.Parameter.KEYWORD_ONLY]
    if wrong:
        raise TypeError(f"{body.__name__}: parameters must be keyword-only: {', '.join(wrong)}")
    return tuple(item.name for item in found)


def quantity(
    unit: str,
    *,
    label: str,
    symbol: str = "",
    source: str = "definition",
    group: str = "emission",
    log: bool = False,
    kind: str = "number",
    choices: tuple[str, ...] = (),
    note: str = "",
) -> Callable[[Body], Body]:
    """Publish a formula as a quantity under its function's name (see `Quantity`)."""

    def publish(body: Body) -> Body:
        name = body.__name__
        REGISTRY.add_node(name, {}, body)
        doc = inspect.getdoc(body) or ""
        REGISTRY.quantities[name] = Quantity(
            name, unit, label, symbol, source, group, log, kind, choices, note, doc
        )
        return body

    return publish


def part(body: Body) -> Body:
    """Put an internal formula under its function's name; it may return anything."""
    REGISTRY.add_node(body.__name__, {}, body)
    return body


def variant(name: str, **when: Any) -> Callable[[Body], Body]:
    """Another body for `name`, used where every condition holds.

    A condition is an input's name and a word (a choice), a class (another whole value), None (a
    whole value not given) or a number that the whole input must equal everywhere.
    """

    def attach(body: Body) -> Body:
        REGISTRY.add_node(name, when, body)
        return body

    return attach


def caution(
    sentence: str, *, label: str, about: Iterable[str] = (), voids: Iterable[str] = ()
) -> Callable[[Body], Body]:
    """Publish a mask as a caution under its function's name (see `Caution`)."""

    def publish(body: Body) -> Body:
        name = body.__name__
        REGISTRY.add_node(name, {}, body)
        REGISTRY.cautions[name] = Caution(
            name, sentence, label, tuple(about), tuple(voids), inspect.getdoc(body) or ""
        )
        return body

    return publish


def view(prefix: str, **replaced: str) -> None:
    """Give every formula a second name, `prefix_name`: the same with some formulas replaced.

    replaced: formula -> the formula that stands in its place. So a second transition of the
    emitter follows the first one's formulas, variants included, and none is written twice.
    """
    REGISTRY.views[prefix] = replaced


def split_view(name: str) -> tuple[str, str]:
    """`prefix_name` as (prefix, name); KeyError if the name is neither known nor a view's."""
    for prefix in REGISTRY.views:
        inner = name.removeprefix(f"{prefix}_")
        if inner != name and (inner in REGISTRY.nodes):
            return prefix, inner
    raise KeyError(name)


def _known(name: str) -> bool:
    if name in REGISTRY.inputs or name in REGISTRY.nodes:
        return True
    try:
        split_view(name)
    except KeyError:
        return False
    return True


def add_input(entry: Input) -> Input:
    """Register an input; its name must be new."""
    if entry.name in REGISTRY.inputs:
        raise TypeError(f"input {entry.name} is defined twice")
    REGISTRY.inputs[entry.name] = entry
    return entry


def formula_parameters(name: str) -> set[str]:
    """Everything that any body of a formula, or the choice between them, or a default refers to."""
    if name in REGISTRY.inputs:
        default = REGISTRY.inputs[name].default
        return set(parameters(default)) if callable(default) else set()
    if name not in REGISTRY.nodes:
        prefix, inner = split_view(name)
        return {inner, *REGISTRY.views[prefix].values()}
    needed: set[str] = set()
    for when, body in REGISTRY.nodes[name].bodies:
        needed |= set(parameters(body)) | set(when)
    return needed


@cache
def dependencies(name: str, given: frozenset[str] = frozenset()) -> frozenset[str]:
    """All inputs and formulas that a formula (or a default) can depend on, itself included.

    given: inputs that have a value, so that nothing reaches through their defaults.
    """
    found: set[str] = set()
    stack = [name]
    while stack:
        current = stack.pop()
        if current not in found:
            found.add(current)
            if current not in given:
                stack.extend(formula_parameters(current))
    return frozenset(found)


def check() -> None:
    """Check the wiring; TypeError names the first thing that is wrong."""
    known = set(REGISTRY.inputs) | set(REGISTRY.nodes)
    both = set(REGISTRY.inputs) & set(REGISTRY.nodes)
    if both:
        raise TypeError(f"names both of an input and of a formula: {', '.join(sorted(both))}")
    for name in known:
        unknown = {needed for needed in formula_parameters(name) if not _known(needed)}
        if unknown:
            raise TypeError(f"{name} refers to unknown names: {', '.join(sorted(unknown))}")
    for name in REGISTRY.nodes:
        bodies = REGISTRY.nodes[name].bodies
        if bodies[-1][0]:
            raise TypeError(f"{name} has no unconditional body")
        for when, _ in bodies:
            wrong = set(when) - set(REGISTRY.inputs)
            if wrong:
                raise TypeError(f"a variant of {name} is chosen by what is no input: {wrong}")
    for entry in REGISTRY.quantities.values():
        units.unit_name(entry.unit)
        if not entry.doc:
            raise TypeError(f"{entry.name} is not documented")
    for mark in REGISTRY.cautions.values():
        wrong = (set(mark.about) | set(mark.voids)) - known
        if wrong:
            raise TypeError(f"caution {mark.name} refers to unknown names: {sorted(wrong)}")
    _refuse_cycles()


def _refuse_cycles() -> None:
    state: dict[str, int] = {}

    def visit(name: str, trail: tuple[str, ...]) -> None:
        if state.get(name) == 2:
            return
        if state.get(name) == 1:
            raise TypeError("formulas refer to each other in a circle: " + " → ".join(trail))
        state[name] = 1
        for needed in formula_parameters(name):
            visit(needed, (*trail, needed))
        state[name] = 2

    for name in (*REGISTRY.inputs, *REGISTRY.nodes):
        visit(name, (name,))
