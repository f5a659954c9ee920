"""What a good engineer would notice in a plan beyond its limits, each kind once for all curves."""

from cant.explaining.notices.everything import notices_of
from cant.explaining.notices.notice import Notice

__all__ = ["Notice", "notices_of"]
