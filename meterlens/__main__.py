"""The command line: ``meterlens`` or ``python -m meterlens``."""

from __future__ import annotations

from meterlens.cli.main import main

__all__ = ["main"]

if __name__ == "__main__":
    main()
