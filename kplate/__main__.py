"""Run the command line: ``python -m kplate``."""

import sys

from kplate.cli import main

if __name__ == "__main__":
    sys.exit(main())
