"""Run every command that the documents show and write its output anew: `python -m tests.renew_documents`.

Read the difference before committing it.
"""

from __future__ import annotations

import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent))

from command import ROOT
from documents import DOCUMENTS, renewed


def main() -> None:
    for path in DOCUMENTS:
        before = path.read_text(encoding="utf-8")
        after = renewed(before)
        if after != before:
            path.write_text(after, encoding="utf-8")
            print(f"wrote {path.relative_to(ROOT)}")


if __name__ == "__main__":
    main()
