"""Build the chart's fonts: static, subset, renamed instances with the sky's symbols merged into each.

Run as a script: `python build_fonts.py NOTO_FOLDER`, with `fonttools`, `fontpkg-source-serif-4` and
`fontpkg-source-sans-3` installed and NOTO_FOLDER holding NotoSansSymbols-Regular.ttf and NotoSansSymbols2-Regular.ttf
(Debian package `fonts-noto-core`: `apt-get download fonts-noto-core`, then `dpkg-deb -x`).

The families are renamed because the Open Font License reserves the name of a modified font. Merging the symbols into
every face means that no label ever falls back to a font of the desktop, so screen, film and print agree.
"""

import sys
from importlib.util import find_spec
from pathlib import Path

from fontTools import subset
from fontTools.pens.boundsPen import BoundsPen
from fontTools.pens.recordingPen import DecomposingRecordingPen
from fontTools.pens.transformPen import TransformPen
from fontTools.pens.ttGlyphPen import TTGlyphPen
from fontTools.ttLib import TTFont
from fontTools.varLib import instancer

HERE = Path(__file__).parent
sys.path.insert(0, str(HERE.parent))
import _provenance  # noqa: E402

DATE = "2026-12-01"
SANS = ("source_sans_3", "SourceSans3[wght].ttf")
ROMAN = ("source_serif_4", "SourceSerif4[opsz,wght].ttf")
ITALIC = ("source_serif_4", "SourceSerif4-Italic[opsz,wght].ttf")
FACES = (
    # file, family, style, (source package, source file), axes
    ("ColureSans-Regular.ttf", "Colure Sans", "Regular", SANS, {"wght": 400}),
    ("ColureSans-Bold.ttf", "Colure Sans", "Bold", SANS, {"wght": 620}),
    ("ColureSerif-Regular.ttf", "Colure Serif", "Regular", ROMAN, {"wght": 410, "opsz": 11}),
    ("ColureSerif-Italic.ttf", "Colure Serif", "Italic", ITALIC, {"wght": 410, "opsz": 11}),
    ("ColureSerif-Bold.ttf", "Colure Serif", "Bold", ROMAN, {"wght": 640, "opsz": 14}),
)
TEXT = [
    *range(0x20, 0x7F),
    *range(0xA0, 0x180),  # Latin-1 and Extended-A: names of sites and stars
    *range(0x2B0, 0x2E0),
    *range(0x384, 0x3CF),  # Greek
    *range(0x2010, 0x2028),
    0x202F, 0x2032, 0x2033, 0x2039, 0x203A, 0x2044,
    0x2070, *range(0x2074, 0x208F),
    0x2190, 0x2191, 0x2192, 0x2193, 0x2194,
    0x2202, 0x2206, 0x2211, 0x2212, 0x221A, 0x221E, 0x2248, 0x2260, 0x2264, 0x2265,
    0x25A0, 0x25A1, 0x25B2, 0x25B6, 0x25BC, 0x25C0, 0x25CB, 0x25CF, 0x2713, 0x2016,
]  # fmt: skip
SKY = [0x263D, 0x263E, *range(0x263F, 0x2648), *range(0x2648, 0x2654), 0x260A, 0x260B, 0x26E2]
SUN = 0x2609
BODIES = {SUN, 0x263D, 0x263E, *range(0x263F, 0x2648), 0x26E2}
HEIGHT, WIDTH, MIDDLE, BEARING = 740, 760, 325, 70


def merge(face: TTFont, donor: TTFont, codes: list[int]) -> None:
    """Copy the glyphs of `codes` from `donor` into `face`; both have 1000 units to the em."""
    assert face["head"].unitsPerEm == donor["head"].unitsPerEm
    cmap, glyphs = donor.getBestCmap(), donor.getGlyphSet()
    for code in codes:
        name = f"uni{code:04X}"
        recording = DecomposingRecordingPen(glyphs)
        glyphs[cmap[code]].draw(recording)
        bounds = BoundsPen(None)
        recording.replay(bounds)
        left, low, right, high = bounds.bounds
        # The signs come in several sizes: one height, centred on the figures, with air on both sides.
        scale = HEIGHT / (high - low) if code in BODIES else min(1.0, WIDTH / (right - left))
        shift = (BEARING - left * scale, MIDDLE - (low + high) / 2 * scale)
        pen = TTGlyphPen(None)
        recording.replay(TransformPen(pen, (scale, 0, 0, scale, *shift)))
        glyph = pen.glyph()
        face["glyf"][name] = glyph
        glyph.recalcBounds(face["glyf"])
        face["hmtx"][name] = (round((right - left) * scale) + 2 * BEARING, glyph.xMin)
        for table in face["cmap"].tables:
            if table.isUnicode():
                table.cmap[code] = name
    face.setGlyphOrder([*face.getGlyphOrder()])


def rename(face: TTFont, family: str, style: str, weight: int) -> None:
    """Give the face a name of its own, keeping copyright and licence."""
    kept = [record for record in face["name"].names if record.nameID in {0, 13, 14}]
    face["name"].names = kept
    names = {
        1: family, 2: style, 3: f"1.0;colure;{family} {style}", 4: f"{family} {style}", 5: "Version 1.0",
        6: f"{family.replace(' ', '')}-{style}",
        10: "Modified for Colure: one weight, a subset of the letters, symbols from Noto Sans Symbols merged in.",
    }  # fmt: skip
    for key, value in names.items():
        face["name"].setName(value, key, 3, 1, 0x409)
    os2, head = face["OS/2"], face["head"]
    bold, italic = style == "Bold", style == "Italic"
    os2.usWeightClass = 700 if bold else 400
    os2.fsSelection = (os2.fsSelection & ~0b1100001) | (0x20 if bold else 0) | (0x01 if italic else 0)
    if not (bold or italic):
        os2.fsSelection |= 0x40
    head.macStyle = (1 if bold else 0) | (2 if italic else 0)
    # A fixed stamp: the same sources give the same bytes.
    head.created = head.modified = 3_848_000_000
    if "STAT" in face:
        del face["STAT"]


def build(noto: Path) -> None:
    symbols = TTFont(noto / "NotoSansSymbols-Regular.ttf")
    symbols2 = TTFont(noto / "NotoSansSymbols2-Regular.ttf")
    entries = []
    for file, family, style, (package, source), axes in FACES:
        spec = find_spec(f"fontpkg_{package}")
        assert spec is not None
        assert spec.origin is not None
        variable = TTFont(Path(spec.origin).parent / "files" / source, recalcTimestamp=False)
        face = instancer.instantiateVariableFont(variable, axes, inplace=False)
        options = subset.Options()
        # Kerning and accents only: a ligature would be narrower than the advance table says.
        options.layout_features = ["kern", "mark", "mkmk", "ccmp"]
        options.hinting = False
        options.name_IDs = ["*"]
        options.notdef_outline = True
        options.glyph_names = True
        cutter = subset.Subsetter(options)
        present = face.getBestCmap()
        cutter.populate(unicodes=[code for code in TEXT if code in present])
        cutter.subset(face)
        merge(face, symbols, SKY)
        merge(face, symbols2, [SUN])
        rename(face, family, style, int(axes["wght"]))
        face["post"].formatType = 3.0
        face.recalcTimestamp = False
        face.save(HERE / file)
        again = TTFont(HERE / file)
        digits = {again["hmtx"][again.getBestCmap()[ord(digit)]][0] for digit in "0123456789"}
        assert len(digits) == 1, f"{file}: figures are not tabular: {digits}"
        count = len(again.getBestCmap())
        print(f"{file}: {count} characters, figures {digits} wide, {(HERE / file).stat().st_size} bytes")
        title = "Source Sans 3" if "sans" in package else "Source Serif 4"
        entries.append(
            {
                "path": file,
                "source": f"{title} (PyPI fontpkg-{package.replace('_', '-')}); "
                "Noto Sans Symbols and Symbols 2 (Debian fonts-noto-core)",
                "version": ("3.52" if "sans" in package else "4.4") + "; 20201225-1",
                "licence": "OFL-1.1",
                "date": DATE,
                "script": "fonts/build_fonts.py",
                "rows": count,
                "completeness": "Latin, Latin-1, Latin Extended-A, Greek, primes, arrows, "
                "signs of Sun, Moon, planets, nodes and the twelve divisions",
            }
        )
    _provenance.write(HERE, entries)


if __name__ == "__main__":
    build(Path(sys.argv[1]))
