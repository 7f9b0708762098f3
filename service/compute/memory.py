"""How much memory a computation will take, estimated before it starts."""

import os
from typing import Any

import numpy as np
from scipy.sparse import csr_array
from scipy.sparse.csgraph import reverse_cuthill_mckee

from service.compute.machine import Unsound

DENSE_COPIES = 8  # square arrays alive at once in the dense solver
ENTRY_BYTES = 16  # value and index of a sparse entry
DENSE_SHARE = 0.1  # of entries that aren't zero: above, the dense solver is the quicker one
DENSE_UP_TO, NEVER_DENSE_FROM = 1500, 4000


def prefer_sparse(size: int, entries: int) -> bool:
    """Whether a pencil of `size` with so many `entries` is better solved sparse."""
    if size <= DENSE_UP_TO:
        return False
    return size >= NEVER_DENSE_FROM or entries < DENSE_SHARE * size**2


def dense_bytes(size: int) -> int:
    """Of all modes of a dense pencil."""
    return 8 * DENSE_COPIES * size**2


def sparse_bytes(pattern: csr_array[Any], modes: int) -> int:
    """Of a factorization and `modes` vectors.

    The envelope after reverse Cuthill–McKee ordering (George and Liu 1981) bounds the fill of an
    envelope method; minimum degree stays below it on lattices, frames and chains, where it was
    compared.
    """
    size = pattern.shape[0]
    order = reverse_cuthill_mckee(pattern, symmetric_mode=True)
    place = np.empty(size, dtype=int)
    place[order] = np.arange(size)
    entries = pattern.tocoo()
    row, column = place[entries.row], place[entries.col]
    first = np.arange(size)
    np.minimum.at(first, np.maximum(row, column), np.minimum(row, column))
    envelope = int((np.arange(size) - first + 1).sum())
    return 2 * ENTRY_BYTES * envelope + 8 * size * (4 * modes + 60)


def allowed_bytes() -> int:
    """Half of the machine's memory."""
    return os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES") // 2


def check_memory(needed: int, part: str) -> None:
    """Refuse what can't fit.

    Raises
    ------
    Unsound
    """
    allowed = allowed_bytes()
    if needed > allowed:
        raise Unsound(
            f"would need about {needed / 1e9:.1f} GB of memory, and {allowed / 1e9:.1f} GB may be "
            "used: ask for fewer modes or post a smaller or sparser system",
            part,
        )
