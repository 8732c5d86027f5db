"""A brief over a fine series, small enough to be quick and too fine for ranges alone to decide."""

from __future__ import annotations

import re
from pathlib import Path

from command import ROOT


def fine_link(folder: Path, goal: str, distortion: str = "1 ms") -> Path:
    """A brief over a fine series of three positions, without limits on delay but this one."""
    text = (ROOT / "tests" / "benchmarks" / "link.toml").read_text(encoding="utf-8")
    stock = 'r_led = { series = "E48", from = "680", to = "1.8k", power = "0.25 W" }'
    stock += '\nr_load = { series = "E48", from = "3k", to = "7k" }'
    stock += '\nr_be = { series = "E48", from = "300k", to = "2M", absent = true }\n'
    text, found = re.subn(r"r_led = .*\nr_load = .*\nr_be = .*\n", stock, text)
    assert found == 1
    text = text.replace('distortion = "45 us"', f'distortion = "{distortion}"').replace('delay = "70 us"\n', "")
    text = text.replace("GOAL", goal).replace("THEN", "edge time").replace("give", "# give")
    path = folder / "fine.toml"
    path.write_text(text.replace("TABLE", str(ROOT / "catalogs" / "demo.csv")), encoding="utf-8")
    return path
