"""mdof: every mode of a machine on its mounts, how damped it is, and whether the damping shortcut can be trusted."""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from mdof.assembly import assemble
    from mdof.description.network import network
    from mdof.description.reading import load
    from mdof.description.schema import Model
    from mdof.errors import DamagedArchiveError, InputError, MdofError, ModelError, UnverifiedError, UsageError
    from mdof.findings import Finding
    from mdof.modes.analysis import solve
    from mdof.modes.hysteretic import HystereticModes, hysteretic_modes
    from mdof.modes.mode import DampedModes, Mode
    from mdof.modes.regime import Regime
    from mdof.modes.sweep import DamperSweep, sweep
    from mdof.system import System

__version__ = "0.1.0"

# Public names load their modules on first use, so that `mdof --help` does not pay for numpy.
_HOMES = {
    "DamagedArchiveError": "mdof.errors",
    "DamperSweep": "mdof.modes.sweep",
    "DampedModes": "mdof.modes.mode",
    "Finding": "mdof.findings",
    "HystereticModes": "mdof.modes.hysteretic",
    "InputError": "mdof.errors",
    "MdofError": "mdof.errors",
    "Mode": "mdof.modes.mode",
    "Model": "mdof.description.schema",
    "ModelError": "mdof.errors",
    "Regime": "mdof.modes.regime",
    "System": "mdof.system",
    "UnverifiedError": "mdof.errors",
    "UsageError": "mdof.errors",
    "assemble": "mdof.assembly",
    "hysteretic_modes": "mdof.modes.hysteretic",
    "load": "mdof.description.reading",
    "network": "mdof.description.network",
    "solve": "mdof.modes.analysis",
    "sweep": "mdof.modes.sweep",
}

__all__ = [
    "DamagedArchiveError",
    "DampedModes",
    "DamperSweep",
    "Finding",
    "HystereticModes",
    "InputError",
    "MdofError",
    "Mode",
    "Model",
    "ModelError",
    "Regime",
    "System",
    "UnverifiedError",
    "UsageError",
    "assemble",
    "hysteretic_modes",
    "load",
    "network",
    "solve",
    "sweep",
]


def __getattr__(name: str) -> Any:
    if name in _HOMES:
        return getattr(import_module(_HOMES[name]), name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")


def __dir__() -> list[str]:
    return sorted({*globals(), *_HOMES})
