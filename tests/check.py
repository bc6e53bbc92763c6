"""Reads the code without running it: style, types, and the import rule between the rooms.

python3 tests/check.py
"""

import os
import subprocess
import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parent.parent / "addin"))

import start

CHECKS = [
    ["ruff", "check", "."],
    ["ruff", "format", "--check", "."],
    ["mypy", "-p", "tausheet.functions", "-p", "tausheet.templates", "-p", "tausheet.addin"],
    ["lint-imports"],
]


def main() -> int:
    """Run every check; the status of the first that fails."""
    bin_folder = start.prepare("test").parent
    environment = {**os.environ, "MYPYPATH": ".types"}
    failures = []
    for name, *options in CHECKS:
        command = [str(bin_folder / name), *options]
        if subprocess.run(command, cwd=start.ROOT, env=environment).returncode:
            failures.append(" ".join([name, *options]))
    for failure in failures:
        print(f"failed: {failure}", file=sys.stderr)
    return 1 if failures else 0


if __name__ == "__main__":
    raise SystemExit(main())
