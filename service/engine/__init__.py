"""Where a task runs. Worker processes will join `in_line` here."""

from service.engine.in_line import compute

__all__ = ["compute"]
