"""Fewer points of long series, without losing a peak."""

import numpy as np

from service.compute.machine import Floats, Integers


def kept_points(series: Floats, most: int) -> Integers:
    """Indices of at most `most` points of (s, n) series: ends, and extremes of equal stretches.

    The points are cut into stretches of equal number; of each, every series keeps the point where
    it is smallest and the one where it is largest.
    """
    number, size = series.shape
    if size <= most:
        return np.arange(size)
    stretches = max(1, (most - 2) // (2 * number))
    edges = np.linspace(0, size, stretches + 1).astype(int)
    kept = {0, size - 1}
    for first, last in zip(edges[:-1].tolist(), edges[1:].tolist(), strict=True):
        part = series[:, first:last]
        kept.update((first + part.argmin(axis=1)).tolist())
        kept.update((first + part.argmax(axis=1)).tolist())
    return np.array(sorted(kept), dtype=int)
