"""The version of the program, for every output to name; apart so that the lowest room may ask for it."""

from __future__ import annotations

from importlib.metadata import PackageNotFoundError, version

try:
    __version__ = version("cant")
except PackageNotFoundError:  # a source tree that was never installed
    __version__ = "0+unknown"
