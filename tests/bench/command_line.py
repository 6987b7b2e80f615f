"""How long the command line takes to answer."""

from __future__ import annotations

import subprocess
import sys

from tests.bench.rows import Row, best_s


def rows() -> list[Row]:
    """`agewatch --help` as a whole process, beside a Python that does nothing."""
    asked = best_s(
        lambda: subprocess.run([sys.executable, "-m", "agewatch", "--help"], check=True, stdout=-3)
    )
    bare = best_s(lambda: subprocess.run([sys.executable, "-c", ""], check=True))
    return [Row("agewatch --help", asked, "s", bar=0.25, peer="python -c ''", ratio=asked / bare)]
