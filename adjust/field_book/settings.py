"""What the job file says beyond the tables: keys that exclude each other, the frame, the geoid grid."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from adjust.field_book.job_file import DEFAULT_KEYS, INSTRUMENT_KEYS, FrameSection, JobFile, JobFileReader
from adjust.field_book.mistakes import Likeness
from adjust.field_book.schema import TABLES
from adjust.frames import EllipsoidFrame, Frame, GeoidGrid, PlaneFrame


class SettingsReader:
    """Makes the frame and checks the keys of a job file, noting mistakes with the key's line."""

    def __init__(self, job_file: JobFile, reader: JobFileReader, folder: Path) -> None:
        self.job_file = job_file
        self.reader = reader
        self.folder = folder

    def check_names(self) -> None:
        """Note unknown keys of `[tables]` and `[defaults]`, and defaults that name no instrument."""
        for section, keys, known in (
            ("tables", self.job_file.tables, tuple(TABLES)),
            ("defaults", self.job_file.defaults, DEFAULT_KEYS),
        ):
            for key in keys:
                if key not in known:
                    guess = Likeness(known).suggestion(key)
                    self.reader.complain((section, key), f"unknown key{guess or f'; expected {chr(32).join(known)}'}")
        for key, name in self.job_file.defaults.items():
            if name not in self.job_file.instruments and key in INSTRUMENT_KEYS:
                guess = Likeness(self.job_file.instruments).suggestion(name)
                message = f"read {name!r}, but there is no [instruments.{name}]{guess or '; add it'}"
                self.reader.complain(("defaults", key), message)
        self._check_raw_names()
        if self.job_file.datum.mode == "control" and self.job_file.datum.marks is not None:
            message = 'marks carry a datum only under inner constraints; set mode = "inner", or take this key away'
            self.reader.complain(("datum", "marks"), message)

    def _check_raw_names(self) -> None:
        """Note a default target that there is not, and distance meters whose air is described by halves or twice."""
        target = self.job_file.defaults.get("target")
        if target is not None and target not in self.job_file.targets:
            guess = Likeness(self.job_file.targets).suggestion(target)
            message = f"read {target!r}, but there is no [targets.{target}]{guess or '; add it'}"
            self.reader.complain(("defaults", "target"), message)
        ways = (("edm_wavelength_nm", "edm_reference_index"), ("edm_ppm_c", "edm_ppm_d"))
        for name, instrument in self.job_file.instruments.items():
            given = [[key for key in way if getattr(instrument, key) is not None] for way in ways]
            for way, keys in zip(ways, given, strict=True):
                if len(keys) == 1:
                    (other,) = set(way) - set(keys)
                    self.reader.complain(("instruments", name, keys[0]), f"goes with {other}; give both or neither")
            if all(given):
                message = f"{ways[0][0]} describes the same correction; keep one of the two ways"
                self.reader.complain(("instruments", name, given[1][0]), message)

    def frame(self) -> Frame | None:
        """The frame, or None after noting why there is none."""
        section = self.job_file.frame
        return self._plane(section) if section.kind == "plane" else self._ellipsoid(section)

    def _plane(self, section: FrameSection) -> Frame:
        for key in ("crs", "heights", "geoid_grid"):
            if getattr(section, key) is not None:
                message = 'this key belongs to an ellipsoid frame; set kind = "ellipsoid", or take it away'
                self.reader.complain(("frame", key), message)
        return PlaneFrame(earth_curvature=section.earth_curvature is not False)

    def _ellipsoid(self, section: FrameSection) -> Frame | None:
        if section.earth_curvature is not None:
            message = "an ellipsoid is curved by itself; take this key away (it belongs to a plane frame)"
            self.reader.complain(("frame", "earth_curvature"), message)
        if section.crs is None:
            self.reader.complain(("frame", "crs"), 'is missing; an ellipsoid frame needs it, as in crs = "EPSG:25832"')
            return None
        try:
            return EllipsoidFrame(section.crs)
        except ValueError as error:
            self.reader.complain(("frame", "crs"), str(error))
            return None

    def geoid_grid(self) -> GeoidGrid | None:
        """The geoid grid that the job file names, after noting a file that is missing."""
        name = self.job_file.frame.geoid_grid
        if name is None or self.job_file.frame.kind == "plane":
            return None
        grid = GeoidGrid(self.folder / name)
        try:
            grid.heights(np.zeros((1, 2)))
        except (OSError, ValueError) as error:
            self.reader.complain(("frame", "geoid_grid"), str(error))
            return None
        return grid
