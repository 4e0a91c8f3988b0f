"""``python -m fitlib`` is the command ``fitlib``."""

import sys

from fitlib.cli import main

if __name__ == "__main__":
    sys.exit(main())
