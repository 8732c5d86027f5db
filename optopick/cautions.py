"""The words of caution that go with every result."""

from __future__ import annotations

from optopick.brief import Brief, DriveCircuit

FUNCTION_ONLY = (
    "These checks are about function, not safety. Where the coupler is a safety barrier, verify insulation class, "
    "working voltage, creepage and clearance (the board's too), pollution degree, altitude and single-fault heating "
    "against the standard that applies; where local rules ask for it, by someone licensed."
)

HAZARDOUS_DC = 60.0
"""Above this a DC voltage counts as hazardous [V]; 30 V rms and 42.4 V peak for AC (trade article, 2016)."""

HAZARDOUS_PEAK = 42.4


def cautions(brief: Brief) -> tuple[str, ...]:
    """What must be said with any result for this brief."""
    said = [FUNCTION_ONLY]
    if brief.drive.circuit is DriveCircuit.FIELD and brief.drive.supply.high > HAZARDOUS_PEAK:
        said.append(
            f"The field input goes to {brief.drive.supply.high:g} V: above 30 V rms, 42.4 V peak or 60 V DC a voltage "
            "is hazardous to touch."
        )
    return tuple(said)
