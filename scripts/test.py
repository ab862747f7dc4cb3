"""Check everything: python scripts/test.py [arguments of pytest]

Makes .venv beside the code with the developers' tools when needed, then runs ruff, mypy, import-linter and pytest.
All of them run; the status is 1 when any fails.
"""

from __future__ import annotations

import os
import sys
import time

from environment import PYTHON, ROOT, TOOLS, call, prepare


def main(arguments: list[str]) -> int:
    """Returns 0 when every check passes."""
    prepare("dev")
    os.chdir(ROOT)
    python = str(PYTHON)
    checks = {
        "ruff check": [python, "-m", "ruff", "check", "."],
        "ruff format": [python, "-m", "ruff", "format", "--check", "."],
        "mypy": [python, "-m", "mypy"],
        "import-linter": [str(TOOLS / "lint-imports")],
        "pytest": [python, "-m", "pytest", *arguments],
    }
    results: dict[str, tuple[int, float]] = {}
    for name, command in checks.items():
        print(f"== {name}", flush=True)
        start = time.monotonic()
        status = call(*command)
        results[name] = (status, time.monotonic() - start)
        if status == 130:
            return 130
    print("== summary")
    for name, (status, seconds) in results.items():
        print(f"{'passed' if status == 0 else f'FAILED ({status})':<12} {name:<14} {seconds:6.1f} s")
    return 0 if all(status == 0 for status, _ in results.values()) else 1


if __name__ == "__main__":
    try:
        sys.exit(main(sys.argv[1:]))
    except KeyboardInterrupt:
        sys.exit(130)
