"""Write tests/golden/ anew: `python -m tests.renew_golden`, after a change of the formulation that is meant.

Read the difference (`git diff tests/golden`) before committing it: it is the change, row by row.
"""

from __future__ import annotations

import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent))

from golden_models import FOLDER, golden_texts


def main() -> None:
    texts = golden_texts()
    for path in FOLDER.glob("*.lp"):
        if path.name not in texts:
            path.unlink()
            print(f"removed {path.name}")
    for name, text in texts.items():
        path = FOLDER / name
        if not path.exists() or path.read_text(encoding="utf-8") != text:
            path.write_text(text, encoding="utf-8")
            print(f"wrote {name}")


if __name__ == "__main__":
    main()
