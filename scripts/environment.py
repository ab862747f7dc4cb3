"""The environment of the scripts: .venv beside the code, with the package and its extras installed.

Only the standard library is imported, so that this works on a machine that has nothing but Python.
"""

from __future__ import annotations

import hashlib
import json
import os
import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
VENV = ROOT / ".venv"
TOOLS = VENV / ("Scripts" if os.name == "nt" else "bin")
PYTHON = TOOLS / ("python.exe" if os.name == "nt" else "python")
_STAMP = VENV / "mdof-installed.json"
_LEAST = (3, 11)


def prepare(*extras: str) -> None:
    """Make .venv and install the package into it, unless that was done for this pyproject.toml already.

    Leaves with status 2 and a reason when it cannot be done.
    """
    if sys.version_info < _LEAST:
        found = ".".join(map(str, sys.version_info[:3]))
        _leave(f"mdof needs Python {_LEAST[0]}.{_LEAST[1]} or later; this is {found} ({sys.executable})")
    done = _installed()
    if done is not None and set(extras) <= done:
        return
    if done is None and not _works():
        _say(f"making {VENV}")
        if subprocess.call([sys.executable, "-m", "venv", "--clear", str(VENV)]) != 0:
            _leave("the environment could not be made; on Debian and Ubuntu install the package python3-venv")
    wanted = sorted({*extras, *_before()})
    target = f"{ROOT}[{','.join(wanted)}]" if wanted else str(ROOT)
    _say(
        f"installing mdof{' and the tools for ' + ', '.join(wanted) if wanted else ''} into .venv; once, about a minute"
    )
    command = [str(PYTHON), "-m", "pip", "install", "--quiet", "--disable-pip-version-check", "--editable", target]
    if subprocess.call(command, stdout=sys.stderr) != 0:
        _leave("the package could not be installed; see the message above (is there a network connection?)")
    _STAMP.write_text(json.dumps({"key": _key(), "extras": wanted}), encoding="utf-8")


def call(*command: str) -> int:
    """Run a command of the environment and return its exit status; 130 when interrupted."""
    process = subprocess.Popen(command)
    while True:
        try:
            status = process.wait()
        except KeyboardInterrupt:
            continue  # the command has got the interrupt too and ends by itself
        return status if status >= 0 else 128 - status


def _key() -> str:
    """Changes with pyproject.toml, the place of the code and the Python that made the environment."""
    text = (ROOT / "pyproject.toml").read_bytes() + f"\0{ROOT}\0{sys.version_info[:2]}".encode()
    return hashlib.sha256(text).hexdigest()


def _stamp() -> dict[str, object]:
    try:
        found = json.loads(_STAMP.read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return {}
    return found if isinstance(found, dict) else {}


def _before() -> set[str]:
    """Extras that are there already; a re-install keeps them."""
    extras = _stamp().get("extras")
    return set(map(str, extras)) if isinstance(extras, list) else set()


def _installed() -> set[str] | None:
    return _before() if PYTHON.exists() and _stamp().get("key") == _key() else None


def _works() -> bool:
    """True where the environment can install; a half-made or moved one cannot."""
    if not PYTHON.exists():
        return False
    try:
        return subprocess.call([str(PYTHON), "-c", "import pip"], stderr=subprocess.DEVNULL) == 0
    except OSError:
        return False


def _say(text: str) -> None:
    print(text, file=sys.stderr, flush=True)


def _leave(text: str) -> None:
    _say(text)
    sys.exit(2)
