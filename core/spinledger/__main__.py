"""``python -m spinledger`` is the command line."""

import sys

from spinledger.cli import main

if __name__ == "__main__":
    sys.exit(main())
