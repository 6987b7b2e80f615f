"""`python -m tests.bench [NAME…] [--json]`: every budget, measured on this machine in one run."""

from __future__ import annotations

import argparse
import importlib
import json
import sys

NAMES = ("command_line", "assessing")


def main() -> int:
    parser = argparse.ArgumentParser(prog="python -m tests.bench", description=__doc__)
    parser.add_argument("names", nargs="*", metavar="NAME", help=f"of {', '.join(NAMES)}; none: all")
    parser.add_argument("--json", action="store_true", help="one JSON document")
    asked = parser.parse_args()
    unknown = sorted(set(asked.names) - set(NAMES))
    if unknown:
        parser.error(f"no benchmark is named {', '.join(unknown)}; there are {', '.join(NAMES)}")
    found = []
    for name in asked.names or NAMES:
        for row in importlib.import_module(f"tests.bench.{name}").rows():
            found.append(row)
            if not asked.json:
                bar = "" if row.bar is None else f"bar {row.bar:g} {'holds' if row.holds else 'MISSED'}"
                peer = f"{row.ratio:.3g} × {row.peer}" if row.ratio is not None else ""
                print(f"{row.name:58} {row.value:10.4g} {row.unit:4} {bar:18} {peer}".rstrip(), flush=True)
    if asked.json:
        print(json.dumps({"rows": [row.as_json() for row in found]}, indent=1))
    return 0 if all(row.holds for row in found) else 1


if __name__ == "__main__":
    sys.exit(main())
