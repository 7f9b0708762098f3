"""HTTP: read the request, ask for a task, choose the form of the answer."""

from service.routes.table import routes

__all__ = ["routes"]
