"""Makes LibreOffice's files anew from the catalogue: the type library, and the extension.

python -m tausheet.addin.calc.build [FILE.oxt]
"""

from __future__ import annotations

import sys
from pathlib import Path

from tausheet.addin.calc import extension, interface
from tausheet.functions.errors import TausheetError


def main() -> None:
    """Refresh the type library; write the extension when a file for it is named."""
    try:
        refreshed = interface.refresh()
        print(f"{interface.LIBRARY.name}: {'compiled' if refreshed else 'up to date'}")
        for name in sys.argv[1:2]:
            extension.write_package(Path(name))
            print(f"{name}: {len(interface.functions())} cell functions")
    except TausheetError as error:
        raise SystemExit(f"tausheet: {error}") from None


if __name__ == "__main__":
    main()
