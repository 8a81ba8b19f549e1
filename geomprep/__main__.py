"""Run the command line with ``python -m geomprep``."""

import sys

from geomprep.cli.main import main

if __name__ == "__main__":
    sys.exit(main())
