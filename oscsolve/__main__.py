"""``python -m oscsolve``: the command line."""

import sys

from oscsolve.cli.main import main

if __name__ == "__main__":
    sys.exit(main())
