"""Response over time against a general integrator: python -m tests.bench.transient

100 seconds at 1 ms of 60 degrees of freedom under a random force, samples joined by straight lines
every 10 ms, against `scipy.integrate.solve_ivp` (DOP853) at equal accuracy: its tolerance is the
coarsest with which it comes as close to the answer as 1e-6 of the largest displacement. It is run
over the first 2 seconds and its time scaled up, as it goes on at the same pace. Goal: 50 times as
fast.
"""

from collections.abc import Callable
from functools import partial
from time import perf_counter
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.integrate import solve_ivp
from threadpoolctl import threadpool_limits

from service.compute.signals import samples
from service.compute.state_space import state_space
from service.compute.transient import Input, time_history
from tests.compute.test_harmonic import drawn, machine

Floats = NDArray[np.float64]
SIZE, DURATION, STEP, CORNER = 60, 100.0, 1e-3, 1e-2
SHORT, AGREES = 2.0, 1e-6


def timed(call: Callable[[], Any]) -> tuple[float, Any]:
    """Seconds, and what came out."""
    start = perf_counter()
    found = call()
    return perf_counter() - start, found


def compare(dampers: int) -> str:
    """One line: both times and their ratio."""
    M, K, C = drawn(SIZE, dampers)
    C = C if dampers else 0.4 * M + 2e-5 * K
    corners = np.arange(0.0, DURATION + CORNER / 2, CORNER)
    heights = np.random.default_rng(4).normal(size=len(corners))
    times: Floats = np.arange(int(DURATION / STEP) + 1, dtype=float) * STEP
    b, seen = np.eye(SIZE)[3], np.eye(SIZE)[[3, 20, 50]]

    def ours() -> Floats:
        own = machine(M, K, C)
        push = Input(samples(corners, heights), b @ own.B)
        none = np.zeros(SIZE)
        found = time_history(own, state_space(own, 0.0), (none, none), [push])
        return found.seen([(0, seen @ own.B)], times)

    inverse = np.linalg.inv(M)
    A, D, g = inverse @ K, inverse @ C, inverse @ b

    def rate(t: float, x: Floats) -> Floats:
        force = np.interp(t, corners[:300], heights[:300])
        return np.concatenate([x[SIZE:], g * force - A @ x[:SIZE] - D @ x[SIZE:]])

    short = times[times <= SHORT]

    def theirs(rtol: float) -> Floats:
        run = solve_ivp(rate, (0.0, SHORT), np.zeros(2 * SIZE), "DOP853", short, rtol=rtol,
                        atol=rtol * 1e-6)  # fmt: skip
        return np.asarray(seen @ run.y[:SIZE])

    taken, found = timed(ours)
    size = np.abs(found[:, : len(short)]).max()
    rtol, reference, difference = 1e-2, 0.0, np.inf
    while difference > AGREES:
        rtol /= 10.0
        reference, other = timed(partial(theirs, rtol))
        difference = float(np.abs(other - found[:, : len(short)]).max() / size)
    whole = reference * DURATION / SHORT
    return (
        f"{SIZE} degrees of freedom, {dampers or 'proportional'} dampers, {len(times)} times: "
        f"{taken:.2f} s against {whole:.1f} s (rtol {rtol:.0e}), {whole / taken:.0f} times as "
        f"fast, agreement {difference:.1e}"
    )


def main() -> None:
    """Print one line per comparison, on one thread."""
    with threadpool_limits(1):
        print(compare(0))
        print(compare(8))


if __name__ == "__main__":
    main()
