"""``python -m torsionfe`` is the command ``torsionfe``."""

import sys

from torsionfe.cli import main

if __name__ == "__main__":
    sys.exit(main())
