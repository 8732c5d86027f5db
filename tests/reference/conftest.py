"""Let the tests here import tests.reference as `python -m tests.reference.generate` does."""

from __future__ import annotations

import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parents[2]))
