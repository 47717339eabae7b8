"""The full walk: every remedy of the default grid on six data sets, each script under both formula engines.

    python tests/walk_everything.py [DATA ...]

Prints how many scripts ran and how many numbers and texts of table, sentences, page and script were held against each
other, and every one that differs.
"""

from __future__ import annotations

import sys
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent / "emit"))

from agreement import CASES, Found, compare, examined  # its folder is known from here on


def main(names: list[str]) -> int:
    total = Found()
    for case in CASES:
        if names and case.name not in names:
            continue
        start = time.perf_counter()
        exam = examined(case)
        found = compare(exam, case)
        total.add(found)
        print(f"{case.name}: {len(exam)} remedies, {found.scripts} scripts, {found.statements.total()} statements, "
              f"{len(found.wrong)} differ ({time.perf_counter() - start:.0f} s)", flush=True)  # fmt: skip
        for wrong in found.wrong:
            print("   ", wrong)
    for kind, count in sorted(total.statements.items()):
        print(f"  {kind}: {count}")
    print(f"all: {total.scripts} scripts, {total.statements.total()} statements, {len(total.wrong)} differ")
    return 1 if total.wrong or not total.scripts else 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
