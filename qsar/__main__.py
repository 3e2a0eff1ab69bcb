"""``python -m qsar``: the same as the command ``acidity``."""

import sys

from qsar.cli import main

if __name__ == "__main__":
    sys.exit(main())
