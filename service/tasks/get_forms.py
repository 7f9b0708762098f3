"""Questions that fit in an address, for callers that cannot post."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from math import isfinite
from typing import Any

from schemas.faults import Fault, Invalid, pointer


@dataclass(frozen=True, slots=True)
class QueryParameter:
    """One parameter of an address, for the documentation."""

    name: str
    description: str
    example: str


@dataclass(frozen=True, slots=True)
class GetForm:
    """GET /v1/systems/{id}/NAME: a task, its parameters, and the question they make.

    `origins` names the parameters that a field of the question may come from.
    """

    task: str
    parameters: tuple[QueryParameter, ...]
    question: Callable[[Mapping[str, str]], dict[str, Any]]
    origins: Mapping[str, tuple[str, ...]]

    def in_address(self, found: Invalid, query: Mapping[str, str]) -> Invalid:
        """Faults of the question, each at the parameter of the address that it comes from."""
        by_place: dict[str, Fault] = {}
        for fault in found.faults:
            *_, field = fault.pointer.split("/")
            names = [name for name in self.origins.get(field, ()) if name in query]
            place = pointer((names[0],)) if names else fault.pointer
            by_place.setdefault(place, Fault(place, fault.detail))
        return Invalid(list(by_place.values()))


class _Query:
    """Reads the parameters of an address and collects their faults."""

    def __init__(self, query: Mapping[str, str]) -> None:
        self.query = query
        self.faults: list[Fault] = []

    def fault(self, name: str, detail: str) -> None:
        self.faults.append(Fault(pointer((name,)), detail))

    def numbers(self, name: str) -> list[float]:
        """The comma-separated numbers of a parameter."""
        values = []
        for text in filter(None, self.query.get(name, "").split(",")):
            try:
                if "_" in text:  # which Python reads between digits
                    raise ValueError(text)
                values.append(float(text))
            except ValueError:
                self.fault(name, f"'{text[:32]}' isn't a number")
            else:
                if not isfinite(values[-1]):
                    self.fault(name, "must be a finite number")
        if name in self.query and not values and not self.faults:
            self.fault(name, "a number is missing")
        return values

    def number(self, name: str) -> float | None:
        values = self.numbers(name)
        if len(values) > 1:
            self.fault(name, "one number is expected")
        return values[0] if values else None

    def check(self) -> None:
        """Raise what was found."""
        if self.faults:
            raise Invalid(self.faults)


def _modes(query: Mapping[str, str]) -> dict[str, Any]:
    read = _Query(query)
    question: dict[str, Any] = {}
    count, below = read.number("count"), read.number("below_hz")
    read.check()
    if count is not None:
        question["count"] = int(count) if count == int(count) else count
    if below is not None:
        question["below_hz"] = below
    if "shape_scale" in query:
        question["shape_scale"] = query["shape_scale"]
    read.check()
    return question


def _separation(query: Mapping[str, str]) -> dict[str, Any]:
    read = _Query(query)
    rpm, low, high = read.number("rpm"), read.number("min_rpm"), read.number("max_rpm")
    orders, lines = read.numbers("orders"), read.numbers("lines_hz")
    fraction = read.number("fraction")
    if rpm is not None and (low is not None or high is not None):
        read.fault("rpm", "rpm excludes min_rpm and max_rpm")
    elif rpm is None:
        for name, value in (("min_rpm", low), ("max_rpm", high)):
            if value is None and name not in query:
                read.fault(name, "this parameter is needed (or rpm for one speed)")
    if not orders and not lines and not read.faults:
        read.fault("orders", "orders or lines_hz is needed")
    read.check()
    name, first, last = ("now", rpm, rpm) if rpm is not None else ("range", low, high)
    question: dict[str, Any] = {
        "operation": [{"name": name, "min_rpm": first, "max_rpm": last}],
        "excitations": [{"name": f"order {order:g}", "order": order} for order in orders]
        + [{"name": f"line {line:g} Hz", "frequency_hz": line} for line in lines],
    }
    if fraction is not None:
        question["rule"] = {"kind": "fraction", "mode_above": fraction, "mode_below": fraction}
    return question


GET_FORMS: Mapping[str, GetForm] = {
    "modes": GetForm(
        "modes",
        (
            QueryParameter("count", "How many modes, lowest first (no unit).", "6"),
            QueryParameter("below_hz", "Or all modes below this frequency, Hz.", "60"),
            QueryParameter("shape_scale", "mass or largest (no unit).", "largest"),
        ),
        _modes,
        {},
    ),
    "separation": GetForm(
        "separation",
        (
            QueryParameter("min_rpm", "Lowest speed of the operation, rpm.", "1440"),
            QueryParameter("max_rpm", "Highest speed of the operation, rpm.", "1500"),
            QueryParameter("rpm", "Or the present speed alone, rpm.", "1487"),
            QueryParameter(
                "orders", "Orders of the speed, separated by commas (no unit).", "1,2,7"
            ),
            QueryParameter("lines_hz", "Fixed frequencies, separated by commas, Hz.", "100"),
            QueryParameter("fraction", "Margin required on both sides (no unit).", "0.2"),
        ),
        _separation,
        {
            "min_rpm": ("rpm", "min_rpm"),
            "max_rpm": ("rpm", "max_rpm"),
            "order": ("orders",),
            "frequency_hz": ("lines_hz",),
            "name": ("orders", "lines_hz"),
            "mode_above": ("fraction",),
            "mode_below": ("fraction",),
        },
    ),
}
