"""Inputs over time as polynomials on segments, and what a first-order equation makes of them.

A step, a ramp and samples joined by straight lines are polynomials as they stand. A half-sine or a
run-up is interpolated at Chebyshev points on segments so short that what is lost lies below
roundoff. On each segment y′ = λy + p(t) has its solution in closed form, so that no step length
enters the answer.
"""

from collections.abc import Callable
from dataclasses import dataclass
from math import comb, factorial

import numpy as np
from scipy.signal import lfilter

from service.compute.couplings import Complexes
from service.compute.machine import Floats, Integers

SMOOTH_DEGREE, SMOOTH_ANGLE = 9, 0.45  # degree, and radians of phase on each segment
SAME_TIME = 1e-9  # of a step: times closer than this are one


@dataclass(frozen=True, slots=True)
class Signal:
    """A function of time, 0 outside of its segments.

    Attributes
    ----------
    times : (s + 1,) ends of the segments, s, ascending
    coefficients : (s, d + 1) on each: Σ cⱼuʲ, u from 0 to 1
    """

    times: Floats
    coefficients: Floats

    def segment(self, at: Floats) -> tuple[Integers, Floats]:
        """(n,) index of the segment that each time lies in (the later one at an end), and u."""
        index = np.searchsorted(self.times, at, side="right") - 1
        inside = np.clip(index, 0, len(self.coefficients) - 1)
        return index, (at - self.times[inside]) / np.diff(self.times)[inside]

    def at(self, times: Floats, order: int = 0) -> Floats:
        """(n,) values, or values of a derivative; at a jump those after it."""
        found = self
        for _ in range(order):
            found = found.derivative()
        index, u = found.segment(times)
        inside = (index >= 0) & (index < len(found.coefficients))
        last = times == found.times[-1]
        index = np.clip(index, 0, len(found.coefficients) - 1)
        values = _horner(found.coefficients[index], u)
        shown: Floats = np.where(inside | last, values, 0.0)
        return shown

    def derivative(self) -> "Signal":
        """Its slope on each segment; jumps are left out."""
        degree = self.coefficients.shape[1] - 1
        if degree == 0:
            return Signal(self.times, np.zeros_like(self.coefficients))
        slope = self.coefficients[:, 1:] * np.arange(1, degree + 1)
        return Signal(self.times, slope / np.diff(self.times)[:, None])

    def integral(self) -> "Signal":
        """Its integral from the first time on, over the same segments."""
        h = np.diff(self.times)[:, None]
        raised = h * self.coefficients / np.arange(1, self.coefficients.shape[1] + 1)
        start = np.concatenate([[0.0], np.cumsum(raised.sum(axis=1))[:-1]])
        return Signal(self.times, np.hstack([start[:, None], raised]))

    def jumps(self) -> Floats:
        """(s,) steps at the start of each segment."""
        ends = np.concatenate([[0.0], self.coefficients.sum(axis=1)[:-1]])
        jumps: Floats = self.coefficients[:, 0] - ends
        return jumps

    def held_until(self, end: float) -> "Signal":
        """Going on with its last value up to `end`."""
        if end <= self.times[-1]:
            return self
        last = np.zeros((1, self.coefficients.shape[1]))
        last[0, 0] = self.coefficients[-1].sum()
        return Signal(np.append(self.times, end), np.vstack([self.coefficients, last]))

    def quiet_until(self, end: float) -> "Signal":
        """Followed by nothing up to `end`."""
        if end <= self.times[-1]:
            return self
        last = np.zeros((1, self.coefficients.shape[1]))
        return Signal(np.append(self.times, end), np.vstack([self.coefficients, last]))

    def cut_at(self, times: Floats) -> "Signal":
        """The same function with segments from each of `times` to the next.

        Every end of a segment must be among `times`, or outside of them.
        """
        middle = (times[1:] + times[:-1]) / 2
        index = np.searchsorted(self.times, middle, side="right") - 1
        inside = (index >= 0) & (index < len(self.coefficients))
        index = np.clip(index, 0, len(self.coefficients) - 1)
        h = np.diff(self.times)[index]
        first, share = (times[:-1] - self.times[index]) / h, np.diff(times) / h
        old = self.coefficients[index]
        new = np.zeros_like(old)
        degree = old.shape[1]
        for i in range(degree):
            for j in range(i, degree):
                new[:, i] += comb(j, i) * first ** (j - i) * old[:, j]
            new[:, i] *= share**i
        return Signal(times, np.where(inside[:, None], new, 0.0))


def samples(times: Floats, values: Floats) -> Signal:
    """Samples joined by straight lines; where a time stands twice the value jumps."""
    moving = np.diff(times) > 0.0
    lines = np.column_stack([values[:-1], np.diff(values)])
    kept = np.append(moving, True)
    return Signal(times[kept], lines[moving])


def constant(value: float, start: float, end: float) -> Signal:
    """One value from `start` to `end`."""
    return Signal(np.array([start, end]), np.array([[value]]))


def smooth(
    function: Callable[[Floats], Floats], start: float, end: float, turning: float
) -> Signal:
    """A smooth function of time by its Chebyshev interpolants.

    Parameters
    ----------
    function : from an array of times to values
    turning : the largest rate at which its phase turns, rad/s
    """
    number = max(1, int(np.ceil(turning * (end - start) / SMOOTH_ANGLE)))
    times: Floats = np.linspace(start, end, number + 1, dtype=float)
    k = np.arange(SMOOTH_DEGREE + 1)
    nodes = (1.0 - np.cos((2 * k + 1) * np.pi / (2 * len(k)))) / 2
    values = function(times[:-1, None] + np.diff(times)[:, None] * nodes)
    powers: Floats = np.vander(nodes, increasing=True).astype(float)
    return Signal(times, np.asarray(np.linalg.solve(powers, values.T).T, dtype=float))


def _horner(coefficients: Floats, u: Floats) -> Floats:
    values = coefficients[:, -1].copy()
    for j in range(coefficients.shape[1] - 2, -1, -1):
        values = values * u + coefficients[:, j]
    return values


def moments(x: Complexes, degree: int) -> Complexes:
    """(d + 1, …) integrals over u from 0 to 1 of e^{x(1 − u)}·uʲ, j from 0 to d.

    They are j!·φⱼ₊₁(x) of exponential integrators (Hochbruck and Ostermann, Acta Numerica 2010):
    upward from (eˣ − 1)/x where |x| is large, downward from a series where it is small.
    """
    found = np.empty((degree + 1, *x.shape), dtype=complex)
    large = np.abs(x) > max(1.0, degree / 2.25)
    far = np.where(large, x, 1.0)
    found[0] = np.expm1(far) / far
    for j in range(1, degree + 1):
        found[j] = (j * found[j - 1] - 1.0) / far
    near = x[~large]
    below = np.zeros_like(near)
    for k in range(44, -1, -1):
        below = below * near + factorial(degree) / factorial(k + degree + 1)
    for j in range(degree, -1, -1):
        found[j][~large] = below
        below = (1.0 + near * below) / max(j, 1)
    return found


def driven(roots: Complexes, signal: Signal, times: Floats) -> Complexes:
    """(s, n) solutions of y′ = λy + signal at `times`, at rest before the signal.

    Parameters
    ----------
    roots : (s,) λ
    times : (n,) ascending
    """
    on_grid = _on_the_grid(signal, times)
    if on_grid is not None:
        return _at_ends(roots, on_grid)[:, 1 : len(times) + 1]
    at_ends = _at_ends(roots, signal)
    index, u = signal.segment(times)
    return np.array([
        _between(root, ends, signal, index, u, times)
        for root, ends in zip(roots, at_ends, strict=True)
    ]).reshape(len(roots), len(times))  # fmt: skip


def _on_the_grid(signal: Signal, times: Floats) -> Signal | None:
    """The signal cut at evenly spaced `times`, if its own ends lie on them.

    One step is added in front, so that what begins at the first time has begun.
    """
    if len(times) < 3:
        return None
    step = (times[-1] - times[0]) / (len(times) - 1)
    if np.abs(np.diff(times) - step).max() > SAME_TIME * step:
        return None
    places = (signal.times - times[0]) / step
    near = np.rint(places)
    off = np.abs(places - near).max() > SAME_TIME
    if off or near[0] < 0 or (np.diff(near) < 0.5).any():
        return None
    snapped = Signal(times[0] + near * step, signal.coefficients)
    grid = times[0] + step * np.arange(-1, len(times))
    return snapped.cut_at(grid)


def _at_ends(roots: Complexes, signal: Signal) -> Complexes:
    """(s, ends) y at every end of a segment."""
    lengths, which = _lengths(np.diff(signal.times))
    degree = _degree(signal)
    x = roots[:, None] * lengths
    parts = moments(x, degree) * lengths
    found = np.zeros((len(roots), len(signal.times)), dtype=complex)
    if len(lengths) == 1:
        for row, (factor, part) in enumerate(zip(np.exp(x[:, 0]), parts[:, :, 0].T, strict=True)):
            pushed = signal.coefficients[:, : degree + 1] @ part
            found[row, 1:] = lfilter([1.0], [1.0, -factor], pushed)
        return found
    factors = np.exp(x)
    state = np.zeros(len(roots), dtype=complex)
    for k, own in enumerate(which.tolist()):
        state = factors[:, own] * state + signal.coefficients[k, : degree + 1] @ parts[:, :, own]
        found[:, k + 1] = state
    return found


def _lengths(steps: Floats) -> tuple[Floats, Integers]:
    """The different lengths among (s,) steps, and which of them each one has.

    Steps that are even but for the roundoff of large times are one length, their mean.
    """
    mean = float(steps.mean())
    if np.abs(steps - mean).max() <= SAME_TIME * mean:
        return np.array([mean]), np.zeros(len(steps), dtype=int)
    largest = float(steps.max())
    lengths, which = np.unique(np.round(steps / largest, 12), return_inverse=True)
    return lengths * largest, which


def _degree(signal: Signal) -> int:
    used = np.flatnonzero(signal.coefficients.any(axis=0))
    return int(used[-1]) if used.size else 0


def _between(
    root: complex,
    ends: Complexes,
    signal: Signal,
    index: Integers,
    u: Floats,
    times: Floats,
) -> Complexes:
    """y at times between the ends: on from the last end, or free after the last one."""
    found = np.zeros(len(times), dtype=complex)
    after = index >= len(signal.coefficients)
    found[after] = ends[-1] * np.exp(root * (times[after] - signal.times[-1]))
    inside = (index >= 0) & ~after
    k, share = index[inside], u[inside]
    passed = times[inside] - signal.times[k]
    degree = _degree(signal)
    part = moments(root * passed, degree) * passed
    powers = signal.coefficients[k, : degree + 1] * share[:, None] ** np.arange(degree + 1)
    found[inside] = ends[k] * np.exp(root * passed) + (powers * part.T).sum(axis=1)
    return found


def twice_integrated(signal: Signal, times: Floats, order: int = 0) -> Floats:
    """(n,) solution of y″ = signal from rest, or a derivative of it."""
    end = max(float(times[-1]), float(signal.times[-1])) * (1 + 1e-12)
    quiet = signal.quiet_until(end)
    integrals = [quiet, quiet.integral(), quiet.integral().integral()]
    return integrals[2 - order].at(times)
