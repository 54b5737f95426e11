"""One step of the descent: the least of a quadratic model beside straightened constraints."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

#: Weight of what is left unmet: so heavy that the rest counts only among equals.
UNMET = 1e6

#: Least curvature of the model, of a function of about 1 over a box of about 1.
FLATTEST = 1e-6


@dataclass(frozen=True)
class Step:
    """A step d (n,), the pressure of each constraint on it (m,), and what it leaves unmet (>= 0)."""

    move: Array
    pressure: Array
    unmet: float


def root_inverse(curvature: Array) -> Array:
    """B^(-1/2) of symmetric matrices (…, n, n), each made positive: a saddle is left downhill."""
    size, axes = np.linalg.eigh(curvature)
    size = np.maximum(
        np.abs(size), FLATTEST * np.maximum(1.0, np.abs(size).max(axis=-1, keepdims=True) * 1e-6)
    )
    return np.asarray((axes / np.sqrt(size)[..., None, :]) @ np.swapaxes(axes, -1, -2))


def step(
    root: Array, slope: Array, margin: Array, slopes: Array, low: Array, high: Array
) -> Step | None:
    r"""The d with the least :math:`g\cdot d + d\cdot Bd/2 + (\rho t)^2/2`.

    Under :math:`m + J d + t \ge 0` with one slack t for all, and low <= d <= high (low <= 0 <= high).
    root: B^(-1/2). slope: g (n,). margin: m (m,). slopes: J (m, n). A least-distance problem, solved
    by non-negative least squares (Lawson & Hanson, Solving Least Squares Problems, 1974, chapter 23).
    None where the numerics fail.
    """
    from scipy.optimize import nnls

    count, size = slopes.shape
    newton = root @ (root @ slope)
    rows = np.zeros((count + 2 * size, size + 1))
    rows[:count, :size] = slopes @ root
    rows[:count, size] = 1 / UNMET
    rows[count : count + size, :size] = root
    rows[count + size :, :size] = -root
    wanted = np.concatenate([slopes @ newton - margin, low + newton, -high - newton])
    length = np.linalg.norm(rows, axis=1)
    rows, wanted = rows / length[:, None], wanted / length
    largest = float(wanted.max(initial=0.0))
    pressure = np.zeros(count)
    y = np.zeros(size + 1)
    if largest > 0:
        # The shortest y with rows·y >= wanted, in units of its least possible length.
        system = np.vstack([rows.T, wanted / largest])
        target = np.zeros(size + 2)
        target[-1] = 1.0
        try:
            weight, _ = nnls(system, target)
        except RuntimeError:
            return None
        left = 1.0 - float(wanted @ weight) / largest
        if not left > 1e-13:
            return None
        y = rows.T @ weight * (largest / left)
        pressure = (weight * (largest / left) / length)[:count]
    move = np.clip(root @ y[:size] - newton, low, high)
    return Step(move, pressure, max(float(y[size]) / UNMET, 0.0))
