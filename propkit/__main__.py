"""``python -m propkit`` is the ``propkit`` command."""

import sys

from propkit.cli import main

if __name__ == "__main__":
    sys.exit(main())
