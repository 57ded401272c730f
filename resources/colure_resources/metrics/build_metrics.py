"""Build advances.npy: the advance width of every glyph of the shipped fonts, so that the core can measure text.

Needs fontTools. Run as `python build_metrics.py`; reads ../fonts/*.ttf, writes advances.npy and PROVENANCE.toml here.
"""

import sys
from pathlib import Path

import numpy as np
from fontTools.ttLib import TTFont

HERE = Path(__file__).parent
sys.path.insert(0, str(HERE.parent.parent))

from colure_resources import _provenance  # noqa: E402

FACES = ("Sans-Regular", "Sans-Bold", "Serif-Regular", "Serif-Italic", "Serif-Bold")
ZERO_WIDTH = (0xFE0E, 0x200B)


def main() -> None:
    rows = []
    for face, name in enumerate(FACES):
        font = TTFont(HERE.parent / "fonts" / f"Colure{name}.ttf")
        unit = font["head"].unitsPerEm
        widths = font["hmtx"]
        for code, glyph in sorted(font.getBestCmap().items()):
            advance = 0 if code in ZERO_WIDTH else round(widths[glyph][0] * 1000 / unit)
            rows.append((face, code, advance))
        rows += [(face, code, 0) for code in ZERO_WIDTH if code not in font.getBestCmap()]
        digits = {widths[font.getBestCmap()[ord(d)]][0] for d in "0123456789"}
        print(f"{name}: {len(font.getBestCmap())} glyphs, figures {sorted(digits)} (tabular: {len(digits) == 1})")
    table = np.array(sorted(rows), dtype=[("face", "<u1"), ("code", "<u4"), ("advance", "<i2")])
    np.save(HERE / "advances.npy", table)
    _provenance.write(
        HERE,
        [
            {
                "path": "advances.npy",
                "source": "the fonts in ../fonts (see their PROVENANCE.toml)",
                "version": "as shipped",
                "licence": "BSD-3-Clause",
                "date": "2026-12-01",
                "script": "metrics/build_metrics.py",
                "rows": len(table),
                "completeness": "every encoded glyph of the five faces; thousandths of an em",
            }
        ],
    )


if __name__ == "__main__":
    main()
