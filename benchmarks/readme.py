"""Put the tables of ``benchmarks/results`` into the README, between ``<!-- results/NAME.md -->`` and ``<!-- end -->``.

Run it after the benchmarks that write them: ``python benchmarks/readme.py``; ``--check`` only tells whether all fit.
"""

import re
import sys
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
PLACE = re.compile(r"(<!-- (results/\w+\.md) -->\n).*?(<!-- end -->)", re.DOTALL)


def filled(text: str) -> str:
    return PLACE.sub(lambda m: m[1] + "\n" + (ROOT / "benchmarks" / m[2]).read_text().strip() + "\n\n" + m[3], text)


def main() -> int:
    readme = ROOT / "README.md"
    before = readme.read_text()
    after = filled(before)
    if "--check" in sys.argv:
        print("up to date" if before == after else "README.md differs from the results: run benchmarks/readme.py")
        return int(before != after)
    readme.write_text(after)
    return 0


if __name__ == "__main__":
    sys.exit(main())
