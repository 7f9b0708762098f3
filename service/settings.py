"""Every knob of the service: a flag of `wideberth serve`, or WIDEBERTH_… in the environment."""

from collections.abc import Mapping
from dataclasses import dataclass, field, fields
from typing import Any

LARGEST_PORT = 65_535


def _knob(default: Any, help_text: str, least: int | None = None, most: int | None = None) -> Any:
    return field(default=default, metadata={"help": help_text, "least": least, "most": most})


@dataclass(frozen=True, slots=True)
class Settings:
    """What the operator sets; each field is one knob."""

    host: str = _knob("127.0.0.1", "address to listen on; loopback only, until there are keys")
    port: int = _knob(8080, "port to listen on; 0 takes a free one", 0, LARGEST_PORT)
    store: str = _knob("sqlite:///wideberth.db", "where systems and answers are kept")
    workers: int = _knob(1, "server processes on the same store", 1, 256)
    max_body_bytes: int = _knob(8_388_608, "largest request body, also after inflating", 1)
    max_degrees_of_freedom: int = _knob(200_000, "largest system that is computed", 1)
    cache_bytes: int = _knob(67_108_864, "replies kept ready in the memory of each process", 0)

    @classmethod
    def from_environment(cls, environment: Mapping[str, str], **given: Any) -> "Settings":
        """The settings of `environment`, with those that are `given` (and not None) on top.

        Raises
        ------
        ValueError
            A setting of the wrong kind or out of its range; the message names it.
        """
        values: dict[str, Any] = {}
        for knob in fields(cls):
            variable = environment_name(knob.name)
            if given.get(knob.name) is not None:
                values[knob.name] = given[knob.name]
            elif variable in environment:
                values[knob.name] = _converted(environment[variable], type(knob.default), variable)
            _check_range(values.get(knob.name), knob.metadata, variable)
        return cls(**values)

    def to_environment(self) -> dict[str, str]:
        """The same settings as variables, for server processes that are started anew."""
        return {environment_name(k.name): str(getattr(self, k.name)) for k in fields(self)}


def environment_name(knob: str) -> str:
    """WIDEBERTH_… of a knob."""
    return f"WIDEBERTH_{knob.upper()}"


def _converted(text: str, kind: type, variable: str) -> Any:
    try:
        return kind(text)
    except ValueError:
        raise ValueError(f"{variable}: '{text}' isn't a whole number") from None


def _check_range(value: Any, allowed: Mapping[str, Any], variable: str) -> None:
    least, most = allowed["least"], allowed["most"]
    if least is None or value is None or least <= value <= (most or value):
        return
    limits = f"at least {least}" if most is None else f"from {least} to {most}"
    raise ValueError(f"{variable}: {value} can't be used; it is {limits}")
