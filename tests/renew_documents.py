"""Run every command that the documents show and write its output anew, and the page of columns:
`python -m tests.renew_documents`.

Read the difference before committing it.
"""

from __future__ import annotations

import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent))

from command import ROOT
from documents import DOCUMENTS, renewed

from optopick.coupler_columns import columns_markdown

COLUMNS = ROOT / "catalogs" / "README.md"


def main() -> None:
    page = COLUMNS.read_text(encoding="utf-8")
    COLUMNS.write_text(page[: page.index("### Columns")] + columns_markdown() + "\n", encoding="utf-8")
    for path in DOCUMENTS:
        before = path.read_text(encoding="utf-8")
        after = renewed(before)
        if after != before:
            path.write_text(after, encoding="utf-8")
            print(f"wrote {path.relative_to(ROOT)}")


if __name__ == "__main__":
    main()
