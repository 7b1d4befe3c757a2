"""Writers of small vertical grids, so that tests need no grid from anywhere."""

from __future__ import annotations

import struct
from pathlib import Path

import numpy as np

NO_DATA = -88.8888
"""The value that marks an empty node of a GTX grid (NOAA's format; from memory)."""


def write_gtx(path: Path, south: float, west: float, step: float, heights: np.ndarray) -> Path:
    """GTX: big-endian header (south, west, two steps in degrees; rows, columns), then rows from south to north."""
    path.write_bytes(struct.pack(">4d2i", south, west, step, step, *heights.shape) + heights.astype(">f4").tobytes())
    return path


def write_geotiff(path: Path, south: float, west: float, step: float, heights: np.ndarray) -> Path:
    """A one-band GeoTIFF of 32-bit floats on EPSG:4326, rows from north to south, node values (RasterPixelIsPoint).

    TIFF 6.0 (Adobe 1992) section 2 for the directory, OGC 19-008r4 for the geographic tags.
    """
    rows, columns = heights.shape
    image = np.ascontiguousarray(heights[::-1]).astype("<f4").tobytes()
    metadata = b'<GDALMetadata><Item name="TYPE">VERTICAL_OFFSET_GEOGRAPHIC_TO_VERTICAL</Item></GDALMetadata>\0'
    north = south + step * (rows - 1)
    keys = (1, 1, 0, 3, 1024, 0, 1, 2, 1025, 0, 1, 2, 2048, 0, 1, 4326)
    short, long, double, text = 3, 4, 12, 2
    fields = [
        (256, long, struct.pack("<I", columns)),
        (257, long, struct.pack("<I", rows)),
        (258, short, struct.pack("<H", 32)),
        (259, short, struct.pack("<H", 1)),
        (262, short, struct.pack("<H", 1)),
        (273, long, struct.pack("<I", 8)),
        (277, short, struct.pack("<H", 1)),
        (278, long, struct.pack("<I", rows)),
        (279, long, struct.pack("<I", len(image))),
        (339, short, struct.pack("<H", 3)),
        (33550, double, struct.pack("<3d", step, step, 0.0)),
        (33922, double, struct.pack("<6d", 0.0, 0.0, 0.0, west, north, 0.0)),
        (34735, short, struct.pack(f"<{len(keys)}H", *keys)),
        (42112, text, metadata),
    ]
    sizes = {short: 2, long: 4, double: 8, text: 1}
    directory_at = 8 + len(image)
    spill_at = directory_at + 2 + 12 * len(fields) + 4
    directory, spill = struct.pack("<H", len(fields)), b""
    for tag, kind, value in fields:
        place = value.ljust(4, b"\0") if len(value) <= 4 else struct.pack("<I", spill_at + len(spill))
        spill += value + b"\0" * (len(value) % 2) if len(value) > 4 else b""
        directory += struct.pack("<HHI", tag, kind, len(value) // sizes[kind]) + place
    path.write_bytes(b"II*\0" + struct.pack("<I", directory_at) + image + directory + struct.pack("<I", 0) + spill)
    return path
