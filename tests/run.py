"""From a fresh clone to a full test run: installs what the tests need, then runs every test.

    python3 tests/run.py [--campaign] [pytest options]

Standard library only, since it runs before anything is installed.
"""

import os
import shutil
import subprocess
import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parent.parent / "addin"))

import start

LIBREOFFICE = [
    "libreoffice-calc-nogui",
    "python3-uno",
    "fonts-crosextra-carlito",
    "fonts-liberation",
]


def libreoffice_is_here() -> bool:
    """Whether a LibreOffice and the Python that can talk to it are installed."""
    uno = subprocess.run(["/usr/bin/python3", "-c", "import uno"], capture_output=True)
    return bool(shutil.which("soffice")) and uno.returncode == 0


def main() -> int:
    """Install, run, and return pytest's exit status."""
    if not libreoffice_is_here():
        start.install_with_apt(LIBREOFFICE, "The tests need LibreOffice Calc with its Python.")
    python = start.prepare("test")
    # a file's tests stay on one worker, so that each LibreOffice is started once
    command = [str(python), "-m", "pytest", "-n", "2", "--dist", "loadfile", *sys.argv[1:]]
    environment = {**os.environ, "OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1"}
    return subprocess.run(command, cwd=start.ROOT, env=environment).returncode


if __name__ == "__main__":
    raise SystemExit(main())
