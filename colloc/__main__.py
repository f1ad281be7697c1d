"""``python -m colloc``."""

import sys

from colloc.cli.app import main

if __name__ == "__main__":
    sys.exit(main())
