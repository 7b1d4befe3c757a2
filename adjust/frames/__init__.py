"""Frames: the plane and the ellipsoid, coordinates ↔ geometry."""

from adjust.frames.base import Frame, Sight
from adjust.frames.ellipsoid import EllipsoidFrame
from adjust.frames.geoid import GeoidGrid
from adjust.frames.geometry import Geometry
from adjust.frames.plane import PlaneFrame

__all__ = ["EllipsoidFrame", "Frame", "GeoidGrid", "Geometry", "PlaneFrame", "Sight"]
