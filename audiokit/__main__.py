"""`python -m audiokit` is `audiokit`."""

import sys

from audiokit.cli.main import main

if __name__ == "__main__":
    sys.exit(main())
