"""A design: a point with what is wanted of it, what scatters, what is not known, and who decided.

Frozen and hashable, so links, undo, replay and shortlists are made of designs. SI units throughout.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, fields, replace
from functools import lru_cache
from typing import Any

from .built import MOST, Built
from .domain import InputError, finite_number, quoted, shown
from .evaluate import Evaluation, evaluated, limits_of
from .frozen import Frozen
from .inputs import INPUTS
from .registry import REGISTRY
from .scatter import Spread, check_scatter, correlation_matrix

#: Longest text that a name, a note or a line of the decision may be.
LONGEST_TEXT = 4000

#: Where the value of an input comes from.
ORIGINS = ("seen", "from memory", "measured", "typed", "default")


def _text(value: Any, what: str) -> None:
    """InputError for what is no text that a record can hold."""
    if not isinstance(value, str) or len(value) > LONGEST_TEXT:
        raise InputError(f"{what} is a text of at most {LONGEST_TEXT} signs; got {quoted(value)}")
    if any(ord(sign) < 32 and sign not in "\n\t" for sign in value):
        raise InputError(f"{what} holds a control character")
    if any("\ud800" <= sign <= "\udfff" for sign in value):
        raise InputError(f"{what} holds half a sign, which cannot be written")


@dataclass(frozen=True)
class Requirement:
    """What is wanted of a quantity: at least or at most a value, in SI; exactly one of the two.

    Raises InputError for an unknown quantity or a value that is no finite number.
    """

    quantity: str
    at_least: float | None = None
    at_most: float | None = None

    def __post_init__(self) -> None:
        known = REGISTRY.quantities.get(self.quantity) if isinstance(self.quantity, str) else None
        if known is None or known.kind != "number":
            raise InputError(f"{quoted(self.quantity)} is no quantity that can be required")
        if (self.at_least is None) == (self.at_most is None):
            raise InputError(
                f"a requirement on {self.quantity} takes at_least or at_most, one of them"
            )
        name = "at_most" if self.at_least is None else "at_least"
        object.__setattr__(self, name, finite_number(self.limit, f"{name} of {self.quantity}"))

    @property
    def limit(self) -> float:
        """The value required."""
        return self.at_most if self.at_least is None else self.at_least  # type: ignore[return-value]  # one of the two is a number

    @property
    def sense(self) -> str:
        """'≥' or '≤'."""
        return "≤" if self.at_least is None else "≥"

    def met(self, value: Any) -> Any:
        """Whether a value (or each of an array) meets the requirement; not-a-number does not."""
        return value <= self.limit if self.at_least is None else value >= self.limit


def all_requirements(given: Any) -> tuple[Requirement, ...]:
    """Requirements as a tuple. Raises InputError for what is no sequence of them."""
    if isinstance(given, Requirement | str | Mapping) or not isinstance(given, Iterable):
        raise InputError("requirements is a sequence of Requirement, not a single one")
    found = tuple(given)
    for entry in found:
        if not isinstance(entry, Requirement):
            raise InputError(f"{quoted(entry)} is no Requirement")
    return found


@dataclass(frozen=True)
class Unknown:
    """The range, SI, within which an input that is not known lies; it is not scatter."""

    low: float
    high: float

    def __post_init__(self) -> None:
        low = finite_number(self.low, "the low end of a range")
        high = finite_number(self.high, "the high end of a range")
        if low > high:
            raise InputError(f"a range must not run backwards; got {low} to {high}")
        object.__setattr__(self, "low", low)
        object.__setattr__(self, "high", high)


@dataclass(frozen=True)
class Origin:
    """Where the value of an input comes from: kind (see ORIGINS), key of the source, place."""

    kind: str
    source: str = ""
    where: str = ""

    def __post_init__(self) -> None:
        if self.kind not in ORIGINS:
            raise InputError(f"{quoted(self.kind)} is no origin; known: {', '.join(ORIGINS)}")
        _text(self.source, "the source of an origin")
        _text(self.where, "the place in a source")


@dataclass(frozen=True)
class Decision:
    """Who decided, why, and what doubts were left open."""

    who: str = ""
    why: str = ""
    doubts: str = ""


@dataclass(frozen=True)
class Design:
    """A point and everything a meeting says about it.

    point: input name -> SI number or whole value, one design (no arrays). requirements: a sequence
    of `Requirement`. scatter, unknowns, origins: input name -> `Spread`, `Unknown`, `Origin`.
    correlation: pairs of scattering inputs -> coefficient, keys 'one|other'. passing: share of the
    fabricated devices that must meet every requirement, or None. emitter, resonator, optic: keys of
    the catalogue records that the values came from. data: names of measured files -> SHA-256. built:
    devices that were measured, each with a name of its own. Raises InputError for anything that cannot be one.
    """

    point: Mapping[str, Any] = field(default_factory=Frozen)
    requirements: tuple[Requirement, ...] = ()
    scatter: Mapping[str, Spread] = field(default_factory=Frozen)
    unknowns: Mapping[str, Unknown] = field(default_factory=Frozen)
    origins: Mapping[str, Origin] = field(default_factory=Frozen)
    correlation: Mapping[str, float] = field(default_factory=Frozen)
    passing: float | None = None
    name: str = ""
    note: str = ""
    decision: Decision = field(default_factory=Decision)
    emitter: str = ""
    resonator: str = ""
    optic: str = ""
    data: Mapping[str, str] = field(default_factory=Frozen)
    built: tuple[Built, ...] = ()
    #: The point being evaluated; what was worked out once is kept.
    evaluation: Evaluation = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        work = Evaluation(self.point)
        if work.shape:
            raise InputError("a design is one point; give single numbers, no arrays")
        object.__setattr__(self, "evaluation", work)
        point = {
            name: value if INPUTS[name].whole else float(value)
            for name, value in self.point.items()
        }
        object.__setattr__(self, "point", Frozen(point))
        object.__setattr__(self, "requirements", all_requirements(self.requirements))
        for name in ("scatter", "unknowns", "origins", "correlation", "data"):
            if not isinstance(getattr(self, name), Mapping):
                raise InputError(f"{name} = {quoted(getattr(self, name))} is no mapping from names")
            object.__setattr__(self, name, Frozen(getattr(self, name)))
        self._check_companions()
        check_scatter(self.scatter)
        correlation_matrix(self.correlation)
        self._check_share()
        self._check_built()
        self._check_texts()

    def _check_companions(self) -> None:
        kinds = {"unknowns": Unknown, "origins": Origin}
        for attribute, kind in kinds.items():
            for name, value in getattr(self, attribute).items():
                if name not in INPUTS:
                    raise InputError(f"{attribute} names {quoted(name)}, which is no input")
                if not isinstance(value, kind):
                    raise InputError(f"{attribute} of {name} is no {kind.__name__}", name)
                if attribute != "origins" and INPUTS[name].whole:
                    raise InputError(f"{name} is no number, so it has no {attribute}", name)
        for name, unknown in self.unknowns.items():
            for end in (unknown.low, unknown.high):
                if name in JOINT:
                    self.evaluation.changed({name: end})
                else:
                    _check_alone(name, end)

    def _check_share(self) -> None:
        if self.passing is not None:
            share = finite_number(self.passing, "the share of devices that must pass")
            if not 0 <= share <= 1:
                raise InputError(
                    f"the share of devices that must pass = {share:g} is outside 0 to 1"
                )
            object.__setattr__(self, "passing", share)

    def _check_built(self) -> None:
        object.__setattr__(self, "built", tuple(self.built))
        names = [device.name for device in self.built if isinstance(device, Built)]
        if len(names) < len(self.built):
            raise InputError("built holds something that is no Built")
        if len(set(names)) < len(names):
            raise InputError("two measured devices have the same name")
        if len(names) > MOST:
            raise InputError(f"a design carries at most {MOST} measured devices")
        for device in self.built:
            self.evaluation.changed(device.point)

    def _check_texts(self) -> None:
        if not isinstance(self.decision, Decision):
            raise InputError(f"decision = {quoted(self.decision)} is no Decision")
        for name in ("name", "note", "emitter", "resonator", "optic"):
            _text(getattr(self, name), name)
        for entry in fields(Decision):
            _text(getattr(self.decision, entry.name), f"{entry.name} of the decision")
        for name, value in self.data.items():
            _text(name, "the name of a data file")
            _text(value, f"data of {name}")

    def __reduce__(self) -> tuple[Any, ...]:
        """Travels between processes without what was worked out."""
        return _made, ({f.name: getattr(self, f.name) for f in fields(self) if f.init},)

    def with_values(self, **values: Any) -> Design:
        """The same design with some inputs given, as typed by a person: they count as known."""
        origins = {name: Origin("typed") for name in values}
        unknowns = {key: range_ for key, range_ in self.unknowns.items() if key not in values}
        return replace(
            self,
            point=self.point | values,  # type: ignore[operator]  # Frozen after __post_init__
            origins=self.origins | origins,  # type: ignore[operator]  # so here
            unknowns=unknowns,
        )

    def with_scatter(self, name: str, spread: Spread | None) -> Design:
        """The same design with an input that scatters so, or (None) that no longer scatters."""
        kept = {key: value for key, value in self.scatter.items() if key != name}
        if spread is not None:
            return replace(self, scatter={**self.scatter, name: spread})
        pairs = {
            key: value for key, value in self.correlation.items() if name not in key.split("|")
        }
        return replace(self, scatter=kept, correlation=pairs)

    def without_values(self, *names: str) -> Design:
        """The same design with some inputs back at their defaults."""
        keep = {key: value for key, value in self.point.items() if key not in names}
        origins = {key: value for key, value in self.origins.items() if key not in names}
        unknowns = {key: range_ for key, range_ in self.unknowns.items() if key not in names}
        return replace(self, point=keep, origins=origins, unknowns=unknowns)

    def outcome(self, wanted: Any = None) -> dict[str, Any]:
        """Quantities of the design by name; all of them unless `wanted` names some."""
        return evaluated(self.evaluation, REGISTRY.quantities if wanted is None else wanted)

    def origin(self, name: str) -> Origin:
        """Where an input's value comes from; 'default' where it is not given."""
        return self.origins.get(name, Origin("typed" if name in self.point else "default"))

    def cautions(self) -> tuple[str, ...]:
        """Names of the cautions that are true at this point, the order of their definition."""
        marks = evaluated(self.evaluation, REGISTRY.cautions)
        return tuple(name for name, holds in marks.items() if holds)


#: Inputs whose range depends on others, or that others' ranges depend on.
JOINT = frozenset(
    {"numerical_aperture", "reference_side", "temperature", "emission_wavelength"}
).union(*({name, *limits_of(name)} for name in INPUTS if limits_of(name)))


@lru_cache(maxsize=1024)
def _check_alone(name: str, end: float) -> None:
    """InputError where a value is outside an input's own range, whatever the design."""
    Evaluation({name: end})


def _made(parts: dict[str, Any]) -> Design:
    return Design(**parts)


def written(name: str, value: Any, digits: int = 12) -> str:
    """An input's value as the page writes it: '650 nm', '∞', 'standing wave'."""
    entry = INPUTS[name]
    if entry.choices:
        return str(value).replace("_", " ")
    return repr(value) if entry.whole else shown(float(value), entry, digits)
