"""Constructions of one point or one figure from what is known. Points are complex: northing + i · easting, metres.

The argument of a difference of points is an azimuth, clockwise from north.
"""
