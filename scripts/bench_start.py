"""How long a call takes, and how much memory: python scripts/bench_start.py [--repeat N]

Every figure is a ratio with both sides measured in this run, turn by turn, in fresh processes. The peer of a call is
the bare import of the libraries it needs: numpy, scipy.linalg, networkx, h5py and PyYAML. The status is 1 when a limit
is missed.
"""

from __future__ import annotations

import argparse
import os
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
SKID = str(ROOT / "models" / "firewater_skid.yaml")
#: Byte code is kept between calls, as it is for a user.
ENVIRONMENT = {name: value for name, value in os.environ.items() if name != "PYTHONDONTWRITEBYTECODE"}
BARE = "import numpy, scipy.linalg, networkx, h5py, yaml"

#: Builds a tower of masses joined by one-direction connections as a networkx graph, then assembles it.
ASSEMBLY = """
import gc, sys, time
import networkx, numpy, scipy.sparse
import mdof.assembly
count = 100_000
gc.collect()
start = time.perf_counter()
graph = networkx.MultiGraph(title="tower", directions=("z",), damping={})
graph.add_node("ground", kind="ground", centre=(0.0, 0.0, 0.0))
for index in range(count):
    graph.add_node(index, mass=1.0 + index % 7)
for index in range(count):
    below = "ground" if index == 0 else index - 1
    graph.add_edge(index, below, key=f"s{index}", between=(index, below), stiffness=1e6 + index, damping=10.0)
built = time.perf_counter()
system = mdof.assembly.assemble(graph)
assembled = time.perf_counter()
assert system.size == count and len(system.stiffness) == count
print(built - start, assembled - built)
"""


def run(*command: str) -> tuple[float, float]:
    """Wall seconds and peak resident megabytes (NaN where the system does not tell) of one process."""
    start = time.perf_counter()
    process = subprocess.Popen(
        [sys.executable, *command], env=ENVIRONMENT, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL
    )
    if not hasattr(os, "wait4"):
        status, peak = process.wait(), float("nan")
    else:
        _, code, usage = os.wait4(process.pid, 0)
        status = process.returncode = os.waitstatus_to_exitcode(code)
        # Kilobytes on Linux, bytes on macOS.
        peak = usage.ru_maxrss / (1e6 if sys.platform == "darwin" else 1e3)
    seconds = time.perf_counter() - start
    if status != 0:
        sys.exit(f"`{' '.join(command)}` ended with status {status}")
    return seconds, peak


def show(name: str, ours: list[float], peer: list[float], unit: str, limit: float, goal: float | None = None) -> bool:
    """Print one figure as a ratio of medians; True where the limit is met."""
    if any(value != value for value in ours + peer):
        print(f"{name:<34} not measured: this system does not tell a child's peak memory")
        return True
    a, b = statistics.median(ours), statistics.median(peer)
    spread = statistics.median(abs(x / y - a / b) for x, y in zip(ours, peer, strict=True))
    met = a / b <= limit
    wish = f", goal {goal:g}" if goal else ""
    print(
        f"{name:<34} {a / b:5.2f} ± {spread:.2f}   {a:8.3f} {unit} over {b:.3f} {unit}   "
        f"limit {limit:g}{wish}: {'met' if met else 'MISSED'}"
    )
    return met


def main() -> int:
    """Measure, print and judge."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else None)
    parser.add_argument("--repeat", type=int, default=11, help="turns; medians are shown (default 11)")
    turns = max(1, parser.parse_args().repeat)
    bare: list[tuple[float, float]] = []
    skid: list[tuple[float, float]] = []
    helped: list[tuple[float, float]] = []
    built: list[float] = []
    assembled: list[float] = []
    with tempfile.TemporaryDirectory() as folder:
        modes = ("-m", "mdof.cli", "modes", SKID, "--archive", folder)
        run("-c", BARE), run(*modes)  # files in the system's cache, byte code written
        for _ in range(turns):
            bare.append(run("-c", BARE))
            skid.append(run(*modes))
            helped.append(run("-m", "mdof.cli", "--help"))
    for _ in range(max(3, turns // 3)):
        done = subprocess.run([sys.executable, "-c", ASSEMBLY], check=True, capture_output=True, text=True)
        graph, system = map(float, done.stdout.split())
        built.append(graph)
        assembled.append(system)
    seconds, peaks = zip(*bare, strict=True)
    print(
        f"{turns} turns ({len(built)} of assembling), medians of processes started one after the other; "
        "± is the median deviation of the ratio"
    )
    met = [
        show("mdof modes SKID --archive / imports", [s for s, _ in skid], list(seconds), "s", 2.0, 1.5),
        show("mdof --help / imports", [s for s, _ in helped], list(seconds), "s", 0.5),
        show("peak memory of modes / imports", [m for _, m in skid], list(peaks), "MB", 1.8),
        show("assembling / building the graph", assembled, built, "s", 1.0),
    ]
    return 0 if all(met) else 1


if __name__ == "__main__":
    sys.exit(main())
