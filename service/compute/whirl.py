"""Which way a mode whirls: with the spin of the bodies that turn, or against it."""

import numpy as np

from service.compute.damped_modes import Complexes
from service.compute.machine import Floats, Integers

ROUND = 0.01  # of a circle: an orbit flatter than this has no direction


def whirl(
    shape: Complexes,
    weight: Floats,
    owners: Integers,
    axes: Integers,
    spins: dict[int, tuple[int, float]],
) -> str | None:
    """forward, backward, mixed (bodies differ), or None where no turning body orbits.

    Parameters
    ----------
    shape : (n,) complex shape
    weight : (n,) square roots of the diagonal of the mass matrix
    spins : for each point that turns its axis (0 to 2) and the sign of its speed

    Notes
    -----
    A point that moves by Re(u e^{iωt}) in the two lateral axes b, c of its spin goes round from b
    to c, forward about +a, where Im(ū_b u_c) < 0.
    """
    turns = []
    for point, (axis, sign) in spins.items():
        for first in (0, 3):  # translations, then rotations
            pair = [first + (axis + 1) % 3, first + (axis + 2) % 3]
            rows = [np.flatnonzero((owners == point) & (axes == own)) for own in pair]
            if all(row.size for row in rows):
                b, c = (complex(shape[row[0]]) * float(weight[row[0]] or 1.0) for row in rows)
                turns.append((abs(b) ** 2 + abs(c) ** 2, -2.0 * sign * (b.conjugate() * c).imag))
    largest = max((size for size, _ in turns), default=0.0)
    ways = {
        turn > 0.0 for size, turn in turns if size > 1e-6 * largest and abs(turn) > ROUND * size
    }
    if not ways:
        return None
    return "mixed" if len(ways) == 2 else ("forward" if ways.pop() else "backward")
