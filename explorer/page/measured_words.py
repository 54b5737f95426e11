"""What was read and what was fitted, in words and tables."""

from __future__ import annotations

from collections.abc import Iterator
from html import escape
from typing import Any

from ..built import Estimate
from ..design import Design
from ..measured.data import AngularPattern, Coincidences, Decay, Spectrum
from ..measured.enhancement import Enhancement, enhancement
from ..units import text
from .built import spanned

#: Rows left out that are listed one by one.
LISTED = 4


def understood(data: Any) -> str:
    """How a file was read, as HTML: its name, size and units, notes, rows left out."""
    count = len(_axis(data))
    ends = _axis(data)[[0, -1]]
    unit = "m" if isinstance(data, Spectrum) else "rad" if isinstance(data, AngularPattern) else "s"
    reach = " to ".join(text(float(end), unit, 4).replace("-", "−") for end in ends)
    parts = [
        f'<p class="x-first">{escape(data.name)}: {count} rows, {escape(reach)}</p>',
        *(f"<p>{escape(note)}</p>" for note in data.read_as),
    ]
    left = data.dropped
    if left:
        parts.append(f"<p>{len(left)} {'row' if len(left) == 1 else 'rows'} left out:</p>")
        lines = [str(row) for row in left[:LISTED]]
        if len(left) > LISTED:
            lines.append(f"and {len(left) - LISTED} more")
        parts.append(f"<ul>{''.join(f'<li>{escape(line)}</li>' for line in lines)}</ul>")
    return "".join(parts)


def _axis(data: Any) -> Any:
    for name in ("wavelengths", "times", "angles"):
        if hasattr(data, name):
            return getattr(data, name)
    raise TypeError(type(data).__name__)


def result(data: Any, fit: Any) -> str:
    """What a fit found, with intervals, as HTML."""
    rows = "".join(
        f"<tr><th scope=row>{escape(label)}</th><td>{escape(spanned(estimate, unit))}</td></tr>"
        for label, estimate, unit in found(data, fit)
    )
    quality = (
        f"χ² per degree of freedom {fit.chi_square / fit.degrees:.3g}; noise alone would be as far "
        f"off in {100 * fit.p_value:.2g} of 100 cases."
    )
    doubts = "".join(f"<li>{escape(words)}</li>" for words in fit.cautions)
    return (
        f'<table class="x-moves"><caption>in brackets: {100 * fit.level:g} % interval</caption>'
        f"<tbody>{rows}</tbody></table>"
        f'<p class="x-plain">{escape(quality)}</p>'
        + (f'<ul class="x-doubts">{doubts}</ul>' if doubts else "")
    )


def found(data: Any, fit: Any) -> Iterator[tuple[str, Estimate, str]]:
    """Label, value with interval and unit of everything that a fit found."""
    if isinstance(data, Spectrum):
        yield from _lines(fit)
    elif isinstance(data, Decay):
        yield from _times(fit)
    elif isinstance(data, Coincidences):
        yield from _peaks(fit)


def g2_of(fit: Any) -> Estimate:
    """The fitted g²(0), as detected."""
    return Estimate(fit.g2_zero, fit.low, fit.high)


def _peaks(fit: Any) -> Iterator[tuple[str, Estimate, str]]:
    yield "g²(0)", g2_of(fit), "1"
    if fit.signal_share < 1:
        yield "of the emitter alone", fit.emitter_g2_zero, "1"
    if fit.window_g2 is not None:
        bare = Estimate(fit.window_g2, fit.window_g2, fit.window_g2)
        yield "g²(0) of windows, raw", bare, "1"
    yield (
        ("Decay of a peak" if fit.pumping == "pulsed" else "Width of the dip"),
        fit.decay_time,
        "s",
    )
    if fit.period is not None:
        yield "Period", fit.period, "s"
    if fit.background is not None:
        yield "Flat, counts a bin", fit.background, "1"
    if fit.bunching is not None:
        yield "Blinking, height", fit.bunching, "1"
        yield "Blinking, time", fit.bunching_time, "s"


def _lines(fit: Any) -> Iterator[tuple[str, Estimate, str]]:
    yield "Centre", fit.centre, "m"
    if not fit.lines or len(fit.lines) == 1:
        yield "Fast width", fit.fast_linewidth, "m"
        yield "Slow width", fit.slow_linewidth, "m"
        yield "Whole width", fit.total_fwhm, "m"
        return
    yield "Slow width", fit.slow_linewidth, "m"
    for index, (share, offset, width) in enumerate(fit.lines):
        name = "Zero-phonon line" if index == 0 else f"Sideband {index}"
        yield f"{name}, share", share, "%"
        if index:
            yield f"{name}, offset", offset, "m"
        yield f"{name}, width", width, "m"


def _times(fit: Any) -> Iterator[tuple[str, Estimate, str]]:
    if len(fit.lifetimes) == 1:
        yield "Lifetime", fit.lifetimes[0], "s"
        return
    yield "Mean time excited", Estimate(fit.lifetime, fit.low, fit.high), "s"
    yield "First slope", fit.initial_rate, "1/s"
    for index, (time, share) in enumerate(zip(fit.lifetimes, fit.shares, strict=True)):
        yield f"Lifetime {index + 1}", time, "s"
        yield f"Share {index + 1}", share, "%"


def lifetime_of(fit: Any, kind: str) -> Estimate:
    """The lifetime that a decay says [s]: the mean, or one over the first slope."""
    if kind == "mean":
        return Estimate(fit.lifetime, fit.low, fit.high)
    rate = fit.initial_rate
    high = float("inf") if rate.low <= 0 else 1 / rate.low
    return Estimate(1 / rate.value, 1 / rate.high, high)


def enhanced(design: Design, fit: Any, kind: str) -> Enhancement:
    """The enhancement of a device whose decay was fitted, against the design's own lifetime."""

    def ends(name: str) -> tuple[float, float]:
        value = float(design.evaluation.value(name))
        range_ = design.unknowns.get(name)
        return (range_.low, range_.high) if range_ else (value, value)

    low, high = ends("lifetime")
    bare = Estimate(float(design.evaluation.value("lifetime")), low, high)
    others = (0.0, max(1.0, ends("other_modes")[1]))
    return enhancement(
        bare,
        lifetime_of(fit, kind),
        ends("quantum_yield"),
        bulk_rate_ratio=ends("bulk_rate_ratio"),
        other_modes=others,
        quenching=ends("quenching"),
        kind=kind,
    )


def enhancement_words(design: Design, found: Enhancement) -> str:
    """The same as a small table, with what it hangs on, as HTML."""
    low, high = (text(end, "1", 3) for end in found.effective)
    lifetime = text(float(design.evaluation.value("lifetime")), "s")
    rows = (
        ("Rate enhancement", spanned(found.total, "1")),
        ("of it by the mode", f"{low} to {high}"),
    )
    body = "".join(
        f"<tr><th scope=row>{escape(label)}</th><td>{escape(words)}</td></tr>"
        for label, words in rows
    )
    note = (
        f"{found.words}. The mode's part is over the bulk rate, and as wide as this design's quantum "
        "yield and quenching, and other modes from 0 to 1, leave it."
    )
    return (
        f'<table class="x-moves"><caption>{escape(note[0].upper() + note[1:])}</caption><thead><tr>'
        f"<th colspan=2>If in a device, against {escape(lifetime)} bare</th></tr></thead>"
        f"<tbody>{body}</tbody></table>"
    )


def pattern_words(design: Design, data: AngularPattern) -> str:
    """What a pattern says before it is used, as HTML."""
    aperture = float(design.evaluation.value("numerical_aperture"))
    inside = data.collected(aperture / float(design.evaluation.value("medium_index")))
    rows = [
        ("Half-angle at half power", text(data.half_angle, "rad")),
        (f"Inside NA {aperture:.3g}", text(inside, "%")),
    ]
    if data.upward_share is not None:
        rows.append(("Going up", text(data.upward_share, "%")))
    body = "".join(
        f"<tr><th scope=row>{escape(label)}</th><td>{escape(words)}</td></tr>"
        for label, words in rows
    )
    return f'<table class="x-moves"><tbody>{body}</tbody></table>'
