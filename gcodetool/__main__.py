"""Run the command line as ``python -m gcodetool``."""

from __future__ import annotations

from gcodetool.cli.app import main

if __name__ == "__main__":
    main()
