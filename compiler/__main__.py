"""`python -m platewright.compiler` is the command `platewright`."""

import sys

from .driver.cli import main

if __name__ == "__main__":
    sys.exit(main())
