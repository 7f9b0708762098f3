"""Peaks of a response over frequency, and where to put points so that none is missed."""

from collections.abc import Callable
from dataclasses import dataclass
from math import sqrt

import numpy as np
from scipy.optimize import brentq, minimize_scalar

from service.compute.machine import Floats

AWAY_FROM_PEAKS = 0.3  # of the points go everywhere, the others to the resonances
NARROWEST = 1e-5  # of a frequency: a resonance is given points as if at least this wide
Amplitude = Callable[[float], float]


@dataclass(frozen=True, slots=True)
class Peak:
    """A largest amplitude at `place`; `width` is that at amplitude/√2, None where unknown."""

    place: float
    amplitude: float
    width: float | None


def peaks(places: Floats, amplitudes: Floats, at: Amplitude) -> list[Peak]:
    """Local maxima of a response between the first and last of ascending `places`.

    Parameters
    ----------
    places, amplitudes : (f,) frequencies or speeds, and the amplitude there
    at : the amplitude anywhere between
    """
    inner = amplitudes[1:-1]
    tops = 1 + np.flatnonzero((inner > amplitudes[:-2]) & (inner >= amplitudes[2:]))
    return [_refined(places, amplitudes, at, int(top)) for top in tops]


def _refined(places: Floats, amplitudes: Floats, at: Amplitude, top: int) -> Peak:
    found = minimize_scalar(
        lambda place: -at(float(place)),
        bounds=(places[top - 1], places[top + 1]),
        method="bounded",
        options={"xatol": 1e-9 * places[top]},
    )
    place, amplitude = float(found.x), -float(found.fun)
    if amplitude < amplitudes[top]:
        place, amplitude = float(places[top]), float(amplitudes[top])
    level = amplitude / sqrt(2.0)
    edges = [_edge(places, amplitudes, at, top, place, amplitude, level, step) for step in (-1, 1)]
    width = None if edges[0] is None or edges[1] is None else edges[1] - edges[0]
    return Peak(place, amplitude, width)


def _edge(
    places: Floats,
    amplitudes: Floats,
    at: Amplitude,
    top: int,
    place: float,
    amplitude: float,
    level: float,
    step: int,
) -> float | None:
    """Where the response has fallen to `level` on one side, before it rises above the peak."""
    inside, outside = place, top
    while 0 <= outside < len(places):
        if (places[outside] - place) * step > 0.0:
            if amplitudes[outside] > amplitude:
                return None
            if amplitudes[outside] < level:
                return float(
                    brentq(lambda x: at(x) - level, inside, float(places[outside]), xtol=1e-14,
                           rtol=1e-14)
                )  # fmt: skip
            inside = float(places[outside])
        outside += step
    return None


def resolved(low: float, high: float, number: int, centres: Floats, widths: Floats) -> Floats:
    """(number,) ascending places from `low` to `high`, dense where resonances are.

    The density is that of the logarithm with a Cauchy distribution around each resonance, whose
    phase so turns by equal angles from point to point.

    Parameters
    ----------
    centres, widths : (m,) resonances and half their half-power widths
    """
    near = (centres + 4 * widths > low) & (centres - 4 * widths < high)
    centres, widths = centres[near], np.maximum(widths[near], NARROWEST * centres[near])
    angles = np.tan(np.linspace(-1.55, 1.55, 401))
    fine = np.concatenate(
        [np.geomspace(low, high, 2001), (centres[:, None] + widths[:, None] * angles).ravel()]
    )
    fine = np.unique(np.clip(fine, low, high))
    passed = np.log(fine / low) / np.log(high / low)
    if centres.size:
        turned = np.arctan((fine[:, None] - centres) / widths).sum(axis=1)
        turned = (turned - turned[0]) / (turned[-1] - turned[0])
        passed = AWAY_FROM_PEAKS * passed + (1 - AWAY_FROM_PEAKS) * turned
    places: Floats = np.interp(np.linspace(0.0, 1.0, number), passed, fine)
    places[0], places[-1] = low, high
    return places


def too_coarse(places: Floats, centres: Floats, widths: Floats) -> list[int]:
    """Indices of resonances within ascending `places` that have fewer than two points per width."""
    inside = (centres > places[0]) & (centres < places[-1])
    gaps = np.diff(places)[np.clip(np.searchsorted(places, centres) - 1, 0, len(places) - 2)]
    return np.flatnonzero(inside & (gaps > widths)).tolist()
