"""Shock response spectrum: the largest responses of single oscillators on a base that is shaken.

y″ + 2ζωy′ + ω²y = −ü for each oscillator, its largest response sought during the record and in the
first period after it (Biot, Transactions ASCE 108, 1943; Harris, Shock and Vibration Handbook,
from memory).
"""

from dataclasses import dataclass

import numpy as np

from service.compute.couplings import Complexes
from service.compute.machine import Floats
from service.compute.signals import Signal, driven

PER_PERIOD = 16  # points on which peaks are sought first
CLOSER, ROUNDS = 33, 4  # points around the highest, so many times over
MOST = 400_000  # points to a record


@dataclass(frozen=True, slots=True)
class Spectrum:
    """(m,) largest relative displacement (m) and absolute acceleration (m/s²) per oscillator."""

    displacement: Floats
    acceleration: Floats


def shock_spectrum(signal: Signal, frequencies: Floats, ratio: float) -> Spectrum:
    """The spectrum of a base acceleration (m/s²) for natural frequencies in Hz, damping below 1."""
    found = np.array([_oscillator(signal, 2 * np.pi * float(hz), ratio) for hz in frequencies])
    return Spectrum(found[:, 0], found[:, 1])


def _oscillator(signal: Signal, omega: float, ratio: float) -> tuple[float, float]:
    root = omega * complex(-ratio, np.sqrt(1.0 - ratio**2))
    end = signal.times[-1] + 2 * np.pi / omega
    span = end - signal.times[0]
    number = min(MOST, int(np.ceil(PER_PERIOD * span * omega / (2 * np.pi))) + 2)
    even = np.linspace(signal.times[0], end, number)
    times = np.union1d(even, signal.times) if len(signal.times) < MOST else even
    # y = Re(z/(iω_d))·(−1), and the absolute acceleration is −(ω²y + 2ζωy′).
    relative = complex(1j / root.imag)
    absolute = -(omega**2 + 2 * ratio * omega * root) * relative
    return _largest(signal, root, relative, times), _largest(signal, root, absolute, times)


def _largest(signal: Signal, root: complex, weight: complex, times: Floats) -> float:
    roots: Complexes = np.array([root])
    best = 0.0
    for _ in range(ROUNDS):
        size = np.abs((weight * driven(roots, signal, times)[0]).real)
        top = int(size.argmax())
        best = max(best, float(size[top]))
        low, high = times[max(top - 1, 0)], times[min(top + 1, len(times) - 1)]
        times = np.linspace(low, high, CLOSER)
    return best
