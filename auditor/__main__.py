"""``python -m auditor``: the same as the command ``auditor``."""

from __future__ import annotations

import sys

from auditor.command_line import main

if __name__ == "__main__":
    sys.exit(main())
