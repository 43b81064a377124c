"""`python -m server` is `ebbline`."""

import sys

from server.cli import main

sys.exit(main())
