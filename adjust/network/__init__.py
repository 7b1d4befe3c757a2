"""The network: what hangs together, what datum it lacks, which marks cannot be determined, where to start."""

from adjust.network.parts import Part, datum_parts
from adjust.network.solvable import check_solvable
from adjust.network.start import Start, find_start

__all__ = ["Part", "Start", "check_solvable", "datum_parts", "find_start"]
