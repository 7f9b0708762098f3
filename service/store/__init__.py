"""Systems and answers by content id."""

from service.store.store import Store

__all__ = ["Store"]
