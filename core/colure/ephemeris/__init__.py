"""Where the Sun, the Moon and the planets are: the embedded tables, or a kernel file of the user's own."""

from functools import cache
from pathlib import Path

from colure.ephemeris.protocol import BODIES, KM_PER_AU, SYSTEM_BARYCENTRES, Ephemeris

__all__ = ["BODIES", "KM_PER_AU", "SYSTEM_BARYCENTRES", "Ephemeris", "default", "open_kernel"]


@cache
def default() -> Ephemeris:
    """Return the embedded ephemeris (years −2999 to 3000), opened once; nothing is read before the first answer."""
    from colure.ephemeris.embedded import Embedded

    return Embedded()


def open_kernel(path: str | Path) -> Ephemeris:
    """Return an SPK kernel file as an ephemeris; raise KernelError with one clear line if it is not usable."""
    from colure.ephemeris.kernel import Kernel

    return Kernel(path)
