"""Find and archive the modes of models, on a machine that has only Python: python scripts/run.py [MODEL...]

Makes .venv beside the code and installs the package into it when needed, then runs
`mdof modes MODEL... --archive runs`. Without a model it runs the demo, models/firewater_skid.yaml.
Options of `mdof modes` may follow.
"""

from __future__ import annotations

import os
import sys

from environment import PYTHON, ROOT, call, prepare


def main(arguments: list[str]) -> int:
    """Returns the exit status of mdof."""
    prepare()
    if not arguments or arguments[0].startswith("-"):
        demo = ROOT / "models" / "firewater_skid.yaml"
        here = os.getcwd()
        arguments = [os.path.relpath(demo, here) if str(demo).startswith(here) else str(demo), *arguments]
    archive = [] if any(word.startswith("--archive") for word in arguments) else ["--archive", "runs"]
    return call(str(PYTHON), "-m", "mdof.cli", "modes", *arguments, *archive)


if __name__ == "__main__":
    try:
        sys.exit(main(sys.argv[1:]))
    except KeyboardInterrupt:
        sys.exit(130)
