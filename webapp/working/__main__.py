"""Runs a worker: ``python -m webapp.working``, configured as the service is."""

from __future__ import annotations

import argparse
import logging
import os
import sys


def main() -> int:
    """Work until told to stop; give the exit status."""
    parser = argparse.ArgumentParser(prog="python -m webapp.working", description="Does long work of Cant.")
    parser.add_argument("--parent", type=int, help="process with which this one ends")
    asked = parser.parse_args()
    # One processor for a piece; and a process with further threads should not fork.
    for name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
        os.environ[name] = "1"
    from cant.errors import CantError
    from webapp.config import Config
    from webapp.keeping.database import Database
    from webapp.working.worker import Worker

    logging.basicConfig(level=logging.INFO, format="%(asctime)s %(levelname)s %(message)s")
    logging.getLogger("alembic").setLevel(logging.WARNING)
    try:
        config = Config.from_environment()
        Worker(config, Database(config.database), asked.parent).run()
    except CantError as error:
        print(error, file=sys.stderr)
        return 2
    return 0


if __name__ == "__main__":
    sys.exit(main())
