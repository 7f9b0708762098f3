"""The mechanics: pure functions on arrays and small frozen dataclasses."""
