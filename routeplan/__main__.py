"""Run the command line as `python -m routeplan`."""

from __future__ import annotations

import sys

from routeplan.cli import main

if __name__ == "__main__":
    sys.exit(main())
