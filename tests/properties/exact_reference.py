"""Natural frequencies in exact and 66-digit arithmetic, apart from everything in service/.

K and M are assembled in rational numbers from the doubles that a machine was posted with, ties and
massless motions are eliminated exactly, and the rank of K counts the rigid-body motions exactly.
Only then come rounded numbers: M = LLᵀ and the eigenvalues of L⁻¹KL⁻ᵀ by the QR algorithm of FLINT
(https://flintlib.org, `acb_mat_approx_eig_qr`) at 220 bits. The matrix is symmetric, so by Weyl's
inequality a backward-stable algorithm gets every eigenvalue to some n²·2⁻²²⁰ of the norm (Wilkinson
1965), repeated or not; Σλ and Σλ² against the trace and the Frobenius norm show that it did, and
that none is missing.
"""

from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction
from math import pi
from typing import Any

from flint import acb_mat, arb, arb_mat, ctx, fmpq, fmpq_mat

Raw = dict[str, Any]
Row = dict[tuple[str, str], Fraction]
AXES = ("x", "y", "z", "rx", "ry", "rz")
BITS = 220
ACCURACY = Fraction(1, 10**55)  # of the norm: what is claimed of every eigenvalue


@dataclass(frozen=True)
class Reference:
    """What is known of a machine.

    Attributes
    ----------
    values : eigenvalues ω² in rad²/s², ascending, each within `radius`
    rigid : dimension of the null space of K, exact
    """

    values: list[arb]
    radius: arb
    rigid: int

    def holds(self, place: int, kind: str, frequency_hz: float, bound_hz: float) -> bool:
        """Whether the eigenvalue number `place` can lie within the bound of a given frequency."""
        with_precision()
        value = self.values[place]
        low, high = (arb(frequency_hz) + sign * arb(bound_hz) for sign in (-1, 1))
        turned = -value if kind == "diverging" else value
        above = turned - self.radius <= (2 * arb.pi() * high) ** 2
        below = bool(low <= 0) or turned + self.radius >= (2 * arb.pi() * low) ** 2
        return bool(above) and bool(below)

    def is_sharp(self, frequency_hz: float, bound_hz: float) -> bool:
        """Whether a bound claims ten digits of the largest eigenvalue (the mass may cost some)."""
        width = (frequency_hz + bound_hz) ** 2 - frequency_hz**2
        largest = max(abs(float(self.values[0])), abs(float(self.values[-1])))
        return 4 * pi**2 * width <= 1e-10 * largest


def with_precision() -> None:
    """Set the working precision of FLINT."""
    ctx.prec = BITS


def reference(system: Raw) -> Reference:
    """The exact pencil of `system` and its eigenvalues."""
    with_precision()
    K, M = _condensed(*(_of_bodies(system) if system["kind"] == "bodies" else _given(system)))
    A = _standard(K, M)
    values = sorted((value.real for value in acb_mat(A).eig(algorithm="approx")), key=float)
    values = _in_order(values)
    size = A.nrows()
    trace = sum((A[i, i] for i in range(size)), arb(0))
    squares = sum((A[i, j] ** 2 for i in range(size) for j in range(size)), arb(0))
    radius = _rational(ACCURACY) * squares.sqrt()
    assert abs(sum(values, arb(0)) - trace) <= size * radius
    assert abs(sum((v * v for v in values), arb(0)) - squares) <= size * radius * squares.sqrt()
    return Reference(values, arb(radius), size - K.rank())


def _in_order(values: list[arb]) -> list[arb]:
    """Sorted by all digits (`float` has put them in order up to its own)."""
    for place in range(1, len(values)):
        while place and values[place] < values[place - 1]:
            values[place - 1], values[place] = values[place], values[place - 1]
            place -= 1
    return values


def _rational(number: Fraction | float) -> fmpq:
    exact = Fraction(number)
    return fmpq(exact.numerator, exact.denominator)


def _matrix(rows: list[list[Fraction]], columns: int) -> fmpq_mat:
    return fmpq_mat(len(rows), columns, [_rational(value) for row in rows for value in row])


def _given(system: Raw) -> tuple[fmpq_mat, fmpq_mat]:
    size = len(system["mass"])
    K, M = (
        _matrix([[Fraction(v) for v in row] for row in system[name]], size)
        for name in ("stiffness", "mass")
    )
    return K, M


def _of_bodies(system: Raw) -> tuple[fmpq_mat, fmpq_mat]:
    """K = Σ k·bᵀb over scalar springs and M in blocks, through the null space of the ties."""
    free = {
        body["name"]: [
            motion
            for motion in body.get("motions", system["motions"])
            if motion not in body.get("held", [])
        ]
        for body in system["bodies"]
    }
    number = {
        name: index
        for index, name in enumerate((body, motion) for body in free for motion in free[body])
    }
    size = len(number)
    K = [[Fraction(0)] * size for _ in range(size)]
    for stiffness, row in _springs(system, free):
        for first, a in row.items():
            for second, b in row.items():
                K[number[first]][number[second]] += stiffness * a * b
    M = [[Fraction(0)] * size for _ in range(size)]
    for body in system["bodies"]:
        for first, second, mass in _mass(body, free[body["name"]]):
            M[number[first]][number[second]] += mass
    ties = [[row.get(name, Fraction(0)) for name in number] for row in _links(system, free) if row]
    exact_K, exact_M = _matrix(K, size), _matrix(M, size)
    if not ties:
        return exact_K, exact_M
    T = _null_space(_matrix(ties, size))
    return T.transpose() * exact_K * T, T.transpose() * exact_M * T


def _mass(
    body: Raw, motions: list[str]
) -> Iterator[tuple[tuple[str, str], tuple[str, str], Fraction]]:
    inertia = body.get("inertia", {})
    for first in motions:
        for second in motions:
            if first == second and len(first) == 1:
                yield (body["name"], first), (body["name"], second), Fraction(body.get("mass", 0))
            elif len(first) == len(second) == 2 and isinstance(inertia, dict):
                entry = "".join(sorted(first[1] + second[1]))
                yield (body["name"], first), (body["name"], second), Fraction(inertia.get(entry, 0))
            elif first == second:
                yield (body["name"], first), (body["name"], second), Fraction(inertia)


def _springs(system: Raw, free: dict[str, list[str]]) -> Iterator[tuple[Fraction, Row]]:
    bodies = {body["name"]: body for body in system["bodies"]}
    for part in system["connections"]:
        if part["kind"] == "pendulum":
            body = bodies[part["body"]]
            stiffness = (
                Fraction(body["mass"])
                * Fraction(system.get("gravity", 9.80665))
                / Fraction(part["length"])
            )
            for axis in ("x", "y"):
                if axis in free[body["name"]]:
                    yield stiffness, {(body["name"], axis): Fraction(1)}
        elif part["kind"] == "spring":
            for stiffness, axis, direction in _along(part, system):
                yield stiffness, _relative(part, axis, direction, bodies, free)


def _along(part: Raw, system: Raw) -> Iterator[tuple[Fraction, str, list[Fraction]]]:
    """Stiffness, whether a translation or a rotation, and the direction of each scalar spring."""
    stiffness = part["stiffness"]
    if isinstance(stiffness, dict):
        for axis, value in stiffness.items():
            kind = "rotation" if axis[0] == "r" else "translation"
            yield Fraction(value), kind, [Fraction(axis[-1] == name) for name in "xyz"]
    elif "along" in part:
        direction = [Fraction(value) for value in part["along"]]
        length = sum(value * value for value in direction)
        yield Fraction(stiffness) / length, "translation", direction
    else:
        (axis,) = system["motions"]
        kind = "rotation" if axis[0] == "r" else "translation"
        yield Fraction(stiffness), kind, [Fraction(axis[-1] == name) for name in "xyz"]


def _relative(
    part: Raw,
    kind: str,
    direction: list[Fraction],
    bodies: dict[str, Raw],
    free: dict[str, list[str]],
) -> Row:
    """Motion of the second end less that of the first, along or about `direction`."""
    ends = [bodies[end] for end in part["between"] if end != "ground"]
    point = [Fraction(value) for value in part.get("at") or ends[0].get("at", [0, 0, 0])]
    row: Row = {}
    for end, sign in zip(part["between"], (-1, 1), strict=True):
        if end == "ground":
            continue
        centre = [Fraction(value) for value in bodies[end].get("at", [0, 0, 0])]
        arm = [p - c for p, c in zip(point, centre, strict=True)]
        turning = _cross(arm, direction) if kind == "translation" else direction
        moving = direction if kind == "translation" else [Fraction(0)] * 3
        for axis, value in zip(AXES, [*moving, *turning], strict=True):
            if axis in free[end]:
                row[end, axis] = row.get((end, axis), Fraction(0)) + sign * value
    return row


def _cross(a: list[Fraction], b: list[Fraction]) -> list[Fraction]:
    return [
        a[1] * b[2] - a[2] * b[1],
        a[2] * b[0] - a[0] * b[2],
        a[0] * b[1] - a[1] * b[0],
    ]


def _links(system: Raw, free: dict[str, list[str]]) -> Iterator[Row]:
    bodies = {body["name"]: body for body in system["bodies"]}
    for part in system["connections"]:
        if part["kind"] == "link":
            for axis in part["motions"]:
                kind = "rotation" if axis[0] == "r" else "translation"
                direction = [Fraction(axis[-1] == name) for name in "xyz"]
                yield _relative(part, kind, direction, bodies, free)


def _null_space(C: fmpq_mat) -> fmpq_mat:
    """Columns that span what C sends to 0."""
    reduced, rank = C.rref()
    columns = C.ncols()
    pivots = [
        next(column for column in range(columns) if reduced[row, column] != 0)
        for row in range(rank)
    ]
    loose = [column for column in range(columns) if column not in pivots]
    basis = fmpq_mat(columns, len(loose))
    for place, column in enumerate(loose):
        basis[column, place] = fmpq(1)
        for row, pivot in enumerate(pivots):
            basis[pivot, place] = -reduced[row, column]
    return basis


def _condensed(K: fmpq_mat, M: fmpq_mat) -> tuple[fmpq_mat, fmpq_mat]:
    """The Schur complement of K over the null space of M."""
    size = M.nrows()
    N = _null_space(M)
    if not N.ncols():
        return K, M
    reduced, rank = M.rref()
    pivots = [
        next(column for column in range(size) if reduced[row, column] != 0) for row in range(rank)
    ]
    E = fmpq_mat(size, rank)
    for place, column in enumerate(pivots):
        E[column, place] = fmpq(1)
    follow = (N.transpose() * K * N).solve(N.transpose() * K * E)
    R = E - N * follow
    return R.transpose() * K * R, E.transpose() * M * E


def _standard(K: fmpq_mat, M: fmpq_mat) -> arb_mat:
    """L⁻¹KL⁻ᵀ with M = LLᵀ, without its radii."""
    inverse = _cholesky(M).inv()
    A = inverse * arb_mat(K) * inverse.transpose()
    return ((A + A.transpose()) / 2).mid()


def _cholesky(M: fmpq_mat) -> arb_mat:
    size = M.nrows()
    L = arb_mat(size, size)
    for row in range(size):
        for column in range(row + 1):
            if M[row, column] == 0 and not any(L[row, k] != 0 for k in range(column)):
                continue
            rest = sum((L[row, k] * L[column, k] for k in range(column)), arb(0))
            left = arb(M[row, column]) - rest
            L[row, column] = left.sqrt() if row == column else left / L[column, column]
    return L
