"""Tables of named columns, read from and written to CSV, ECSV, VOTable and FITS; input files are not trusted.

`read` takes a file apart by row and lists the rows that cannot be used; `read_positions` also finds and checks a pair
of coordinates; `dumps` and `write` put a table into a file that other software reads.
"""

from colure.tables.model import Column, Read, Rejected, Table, screen
from colure.tables.positions import Positions, read_positions
from colure.tables.reading import FORMATS, MOST_BYTES, form_of, read, read_bytes
from colure.tables.writing import dumps, write

__all__ = [
    "FORMATS",
    "MOST_BYTES",
    "Column",
    "Positions",
    "Read",
    "Rejected",
    "Table",
    "dumps",
    "form_of",
    "read",
    "read_bytes",
    "read_positions",
    "screen",
    "write",
]
