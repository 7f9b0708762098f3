"""Wideberth: natural frequencies, mode shapes and separation of a machine, over HTTP."""

from importlib.metadata import version

__version__ = version("wideberth")
