"""``python -m normalize`` is the command ``normalize``."""

from __future__ import annotations

import sys

from normalize.cli.main import main

if __name__ == "__main__":
    sys.exit(main())
