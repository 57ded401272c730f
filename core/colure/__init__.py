"""Colure's computation library: positions, frames and charts near the ecliptic, without a window."""

__version__ = "0.1.0"
