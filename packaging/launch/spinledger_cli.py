"""Start of the packaged command line."""

from __future__ import annotations

import multiprocessing
import sys

if __name__ == "__main__":
    # A worker process of a packaged program is this program once more.
    multiprocessing.freeze_support()
    from spinledger.cli import main

    sys.exit(main())
