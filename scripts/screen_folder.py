"""Screen every model of a folder: python scripts/screen_folder.py [FOLDER] [LEAST_DAMPING_RATIO]

An example for scripts of your own: it needs nothing but the package.
"""

import math
import sys
from pathlib import Path

import mdof
from mdof.report.screening import screen

folder = Path(sys.argv[1] if len(sys.argv) > 1 else "models")
least = float(sys.argv[2]) if len(sys.argv) > 2 else 0.05
failed = 0
for path in sorted(folder.glob("*.yaml")):
    try:
        modes = mdof.solve(mdof.assemble(mdof.load(path)))
    except mdof.MdofError as error:
        print(f"error  {path.name}: {error}")
        failed += 1
        continue
    result = screen(modes, least_damping_ratio=least, below=2 * math.pi * 60)
    names = ", ".join(f"mode {mode.number} ({mode.regime})" for mode in result.failing)
    verdict = "FAIL" if result.failing else "pass" if result.judged else "none"  # nothing to judge is no pass
    print(f"{verdict}   {path.name}  {names}")
    failed += bool(result.failing)
sys.exit(1 if failed else 0)
