"""``python -m eosmuster``."""

import sys

from eosmuster.cli import main

if __name__ == "__main__":
    sys.exit(main())
