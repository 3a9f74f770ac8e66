"""``python -m gasapi``."""

import sys

from gasapi.cli import main

sys.exit(main())
