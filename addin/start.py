"""From a fresh clone to the first calc sheets: sets up .venv, then runs `tausheet demo`.

    python3 addin/start.py [DIR]

Standard library only, since it runs before anything is installed.
"""

from __future__ import annotations

import hashlib
import os
import shutil
import subprocess
import sys
from pathlib import Path
from typing import NoReturn

ROOT = Path(__file__).resolve().parent.parent
VENV = ROOT / ".venv"
PYTHON = VENV / ("Scripts/python.exe" if os.name == "nt" else "bin/python")


def prepare(extra: str = "") -> Path:
    """Make .venv with tausheet (and an extra such as "test") in it; return its Python."""
    if sys.version_info < (3, 10):
        stop(f"tausheet needs Python 3.10 or newer; this is {sys.version.split()[0]}.")
    done = VENV / f"prepared-{extra or 'use'}"
    wanted = hashlib.sha256((ROOT / "pyproject.toml").read_bytes()).hexdigest()
    ready = done.exists() and done.read_text() == wanted
    if ready and _works([str(PYTHON), "-c", "import tausheet.functions"]):
        return PYTHON
    pip = _environment()
    target = f"{ROOT}[{extra}]" if extra else str(ROOT)
    say(f"installing Python packages into {VENV.name} ...")
    if subprocess.run([*pip, "install", "--quiet", "--editable", target]).returncode:
        stop("The Python packages could not be installed; pip's message above says why.")
    done.write_text(wanted)
    return PYTHON


def install_with_apt(packages: list[str], why: str) -> None:
    """Install Debian packages where that is allowed; otherwise say what to do, and stop."""
    commands: list[str] | None = None
    if shutil.which("apt-get"):
        if os.geteuid() == 0:
            commands = []
        elif shutil.which("sudo") and _works(["sudo", "-n", "true"]):
            commands = ["sudo", "-n"]
    by_hand = f"apt-get install --no-install-recommends {' '.join(packages)}"
    if commands is None:
        stop(f"{why} Ask an administrator to run: {by_hand}")
    say(f"installing {', '.join(packages)} ...")
    quietly = {**os.environ, "DEBIAN_FRONTEND": "noninteractive"}
    subprocess.run([*commands, "apt-get", "update", "-qq"], env=quietly)
    install = [*commands, "apt-get", "install", "-y", "-qq", "--no-install-recommends", *packages]
    if subprocess.run(install, env=quietly, stdout=subprocess.DEVNULL).returncode:
        stop(f"{why} apt-get could not install it; its message above says why.")


def say(text: str) -> None:
    """A line for the one who waits."""
    print(f"tausheet: {text}", file=sys.stderr, flush=True)


def stop(text: str) -> NoReturn:
    """End with one sentence."""
    raise SystemExit(f"tausheet: {text}")


def _works(command: list[str]) -> bool:
    try:
        return subprocess.run(command, capture_output=True).returncode == 0
    except OSError:
        return False


def _environment() -> list[str]:
    """Make the virtual environment where it is missing; return the pip that installs into it."""
    own = [str(PYTHON), "-m", "pip"]
    if _works([*own, "--version"]):
        return own
    for attempt in range(2):
        shutil.rmtree(VENV, ignore_errors=True)
        if _works([sys.executable, "-m", "venv", str(VENV)]):
            return own
        # Debian keeps pip for virtual environments in a package of its own
        shutil.rmtree(VENV, ignore_errors=True)
        outer = [sys.executable, "-m", "pip", "--python", str(PYTHON)]
        bare = _works([sys.executable, "-m", "venv", "--without-pip", str(VENV)])
        if bare and _works([*outer, "--version"]):
            return outer
        if attempt == 0:
            install_with_apt(["python3-venv"], "Python cannot make a virtual environment here.")
    stop("Python cannot make a virtual environment here, even with python3-venv installed.")


if __name__ == "__main__":
    demo = [str(prepare()), "-m", "tausheet.addin.cli", "demo", *sys.argv[1:]]
    raise SystemExit(subprocess.run(demo).returncode)
