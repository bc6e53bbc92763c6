"""The benchmarks: each a ratio to a named baseline in the same run; reported, never failed on.

python3 tests/speed.py [pytest options]
"""

import subprocess
import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parent.parent / "addin"))

import start


def main() -> int:
    """Run the benchmarks one after another on an otherwise quiet machine."""
    python = start.prepare("test")
    command = [
        str(python),
        "-m",
        "pytest",
        "tests/benchmarks",
        "-q",
        "-o",
        "python_files=bench_*.py",
        "-o",
        "python_functions=bench_*",
    ]
    return subprocess.run([*command, *sys.argv[1:]], cwd=start.ROOT).returncode


if __name__ == "__main__":
    raise SystemExit(main())
