"""``python -m bandwright.cli``."""

import sys

from .door import main

if __name__ == "__main__":
    sys.exit(main())
