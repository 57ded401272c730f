"""Overlays: positions and image outlines from other people's files, laid on the chart in the frame they are said to be.

    opening.inspect(path)              what a file says of its columns, units, frame and epoch, and what it leaves out
    opening.declare(found, frame=…)    an Overlay, once nothing is missing
    store.STORE.rows(overlay)          the rows behind it, kept by the hash of the file
    directions.of(overlay, moment)     their directions on ICRS axes
    matching.match(overlay)            the catalogue's stars for them, residuals, a fit, and the reading "as if …"
    images.shape(header)               corners, arrows, parity and grid of a FITS image

Only `Overlay` itself is imported here: a session holds it, and a start without overlays loads nothing more.
"""

from colure.overlays.model import Overlay, OverlayError

__all__ = ["Overlay", "OverlayError"]
