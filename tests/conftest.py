"""What all tests share."""

from hypothesis import settings

settings.register_profile("everywhere", deadline=None, derandomize=True)
"""No deadline, because a busy machine is no defect; the same examples every time, because a red run must repeat."""
settings.load_profile("everywhere")
