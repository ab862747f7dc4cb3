"""Lets the tests of this folder import the helper modules beside them, and fixes their examples.

The examples are the same on every run, so that a failure is a failure of the change at hand. Set MDOF_EXPLORE=1 to let
hypothesis look for new ones.
"""

import os
import sys
from pathlib import Path

from hypothesis import settings

sys.path.insert(0, str(Path(__file__).parent))
settings.register_profile("repeatable", derandomize=True, deadline=None)
settings.register_profile("explore", max_examples=300, deadline=None)
settings.load_profile("explore" if os.environ.get("MDOF_EXPLORE") else "repeatable")
