"""What each kind of observation is called."""

KIND_NAMES = {
    "direction": ("direction", "directions"),
    "angle": ("angle", "angles"),
    "azimuth": ("azimuth", "azimuths"),
    "slope_distance": ("slope distance", "slope distances"),
    "horizontal_distance": ("horizontal distance", "horizontal distances"),
    "zenith": ("zenith angle", "zenith angles"),
    "height_difference": ("height difference", "height differences"),
    "vector": ("vector", "vectors"),
    "control": ("control coordinate", "control coordinates"),
}
"""One, and many."""
