"""Slopes and curvatures from differences, and how fine these must be."""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from .step import Array

#: Steps of the differences, in parts of the box, the coarsest that will do.
LEVELS = (1e-4, 1e-6, 1e-8, 1e-10, 1e-12)
COARSE = LEVELS[0]

#: Rounding of an outcome.
NOISE = 1e-12


@lru_cache(maxsize=64)
def pattern(size: int) -> Array:
    """Where the differences look: the middle, a step up and a step down each axis, each pair up."""
    one = np.eye(size)
    pairs = [one[a] + one[b] for a in range(size) for b in range(a + 1, size)]
    return np.concatenate([np.zeros((1, size)), one, -one, np.reshape(pairs, (-1, size))])


def differences(found: Array, h: Array, middle: Array) -> tuple[Array, Array]:
    """Slopes (k, f, n) and curvatures (k, f, n, n) of outcomes (k, p, f) at a pattern of steps h (k, n).

    middle: where the middle of the pattern lies from where the slopes are wanted (k, n).
    """
    size = h.shape[1]
    centre, up, down = found[:, 0], found[:, 1 : size + 1], found[:, size + 1 : 2 * size + 1]
    slopes = np.swapaxes((up - down) / (2 * h[:, :, None]), 1, 2)
    curvature = np.zeros((*slopes.shape, size))
    own = ((up - centre[:, None]) + (down - centre[:, None])) / h[:, :, None] ** 2
    place = 2 * size + 1
    for one in range(size):
        curvature[:, :, one, one] = own[:, one]
        for other in range(one + 1, size):
            cross = (found[:, place] - up[:, one]) - (up[:, other] - centre)
            cross = cross / (h[:, one] * h[:, other])[:, None]
            curvature[:, :, one, other] = curvature[:, :, other, one] = cross
            place += 1
    slopes -= np.einsum("kfij,kj->kfi", curvature, middle)
    return slopes, curvature


def probes(here: Array, grain: Array) -> Array:
    """Offsets (k, p, n) from places (k, n) at which to look to learn how fine differences must be.

    A step up, the middle and a step down each axis for each level, within the box.
    """
    one = np.eye(len(grain))
    parts = []
    for h in steps(grain):
        middle = (np.clip(here, h, 1 - h) - here)[:, None, :] * one
        parts += [middle + h * one, middle, middle - h * one]
    return np.concatenate(parts, axis=1)


def steps(grain: Array) -> Array:
    """The levels (levels, n), none finer than places can tell."""
    return np.asarray(np.maximum(np.array(LEVELS)[:, None], np.minimum(1e4 * grain, 0.25)))


def resolved(found: Array, grain: Array) -> Array:
    """The coarsest step (k, n) over which each axis is a parabola, as the next finer one tells.

    found: outcomes (k, p, f) at the offsets of `probes`.
    """
    count, size = len(found), len(grain)
    h = steps(grain)[None, :, :, None]
    up, middle, down = np.moveaxis(found.reshape(count, len(LEVELS), 3, size, -1), 2, 0)
    slope = (up - down) / (2 * h)
    bend = ((up - middle) + (down - middle)) / h**2
    straight = (np.abs(bend) * h < 0.1 * np.abs(slope))[:, :-1]
    same = _alike(slope, 0.2, NOISE / h) & (_alike(bend, 0.5, NOISE / h**2) | straight)
    good = np.concatenate([same.all(axis=3), np.ones((count, 1, size), dtype=bool)], axis=1)
    return np.asarray(np.array(LEVELS)[np.argmax(good, axis=1)])


def _alike(estimate: Array, share: float, noise: Array) -> Array:
    """Whether estimates (k, levels, n, f) are those of the next finer level."""
    coarse, finer = estimate[:, :-1], estimate[:, 1:]
    size = np.maximum(np.abs(coarse), np.abs(finer))
    return np.asarray(np.abs(coarse - finer) <= share * size + 10 * noise[:, 1:])
