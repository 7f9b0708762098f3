"""Where a task runs. Worker processes will join `in_line` here."""

from service.engine.in_line import compute, in_thread, is_at_once

__all__ = ["compute", "in_thread", "is_at_once"]
