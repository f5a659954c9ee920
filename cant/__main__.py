"""Lets ``python -m cant`` be the command ``cant``."""

from __future__ import annotations

from cant.cli import main

if __name__ == "__main__":
    main()
