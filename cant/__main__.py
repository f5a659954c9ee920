"""Lets ``python -m cant`` be the command ``cant``."""

from __future__ import annotations

import sys

from cant.cli import main

if __name__ == "__main__":
    sys.exit(main())
