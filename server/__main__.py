"""`python -m server` is `ebbline`."""

import sys

from server.cli import main

if __name__ == "__main__":  # a worker process imports this module too
    sys.exit(main())
