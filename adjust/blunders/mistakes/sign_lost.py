"""A sign left out or put where none belongs."""

from __future__ import annotations

from adjust.blunders.mistakes.interface import Candidates
from adjust.blunders.mistakes.suspect import Suspect


class SignLost:
    """A fall booked as a rise; a component or a coordinate on the other side of its origin."""

    name = "sign"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """Every signed number of the suspect with the other sign."""
        if suspect.angular and suspect.kind != "control":
            return None
        parts = []
        for entry in suspect.values:
            if entry.name in ("rise", "dx", "dy", "dz", "easting", "northing", "latitude", "longitude", "height"):
                text = entry.cell.text
                parts.append(entry.candidates([text[1:] if text.startswith("-") else f"-{text}"], ["wrong sign"]))
        return Candidates.together(parts)
