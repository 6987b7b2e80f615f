"""`python -m agewatch`."""

from __future__ import annotations

from agewatch.cli import main

if __name__ == "__main__":
    main()
