"""``python -m aleafield`` is the command ``aleafield``."""

import sys

from aleafield.cli import main

sys.exit(main())
