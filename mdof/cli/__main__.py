"""``python -m mdof.cli``: the same as the command ``mdof``."""

import sys

from mdof.cli import main

sys.exit(main())
