"""Bayer and Flamsteed designations: the ways they are written, and the one way they are printed."""

import re
from functools import cache

from colure.constellations import constellations

GREEK = (
    ("α", "alpha", "alf", "alp", "al"),
    ("β", "beta", "bet", "be"),
    ("γ", "gamma", "gam", "ga"),
    ("δ", "delta", "del", "de"),
    ("ε", "epsilon", "eps", "ep"),
    ("ζ", "zeta", "zet", "ze"),
    ("η", "eta", "et"),
    ("θ", "theta", "tet", "the", "th"),
    ("ι", "iota", "iot", "io"),
    ("κ", "kappa", "kap", "ka"),
    ("λ", "lambda", "lam", "la"),
    ("μ", "mu", "µ"),
    ("ν", "nu"),
    ("ξ", "xi", "ksi"),
    ("ο", "omicron", "omi"),
    ("π", "pi"),
    ("ρ", "rho", "rh"),
    ("σ", "sigma", "sig", "si", "ς"),
    ("τ", "tau", "ta"),
    ("υ", "upsilon", "ups", "up"),
    ("φ", "phi", "ph", "ϕ"),
    ("χ", "chi", "ch"),
    ("ψ", "psi", "ps"),
    ("ω", "omega", "ome"),
)
"""Each letter of the Greek alphabet, its English name, and the abbreviations in use in catalogues."""

_LETTER = {spelling: row[0] for row in GREEK for spelling in row}
_MARKS = re.compile("['’ʼ.]")
_DASHES = str.maketrans("-_", "  ")
_FORM = re.compile(r"(?P<head>\d{1,3}|[^\W\d_]+)[\s_.-]*(?P<index>\d{1,2})?[\s_.-]+(?P<rest>[^\W\d_][^\d]*)")


@cache
def _constellation_words() -> dict[str, str]:
    return {
        word.casefold(): entry.code for entry in constellations() for word in (entry.code, entry.name, entry.genitive)
    }


def parse(text: str) -> str | None:
    """Return a designation as it is printed ("α Tau", "θ1 Eri", "61 Cyg", "q Car"), or None if the text is none.

    Understood are Greek letters, their names and abbreviations in any case, an index with or without a leading zero
    or as a superscript, single Latin letters (whose case counts), Flamsteed numbers; and the constellation by its
    abbreviation, its name or its genitive.
    """
    import unicodedata  # late: its tables are large, and a chart prints names as they are

    # Compatibility folding turns superscripts into digits and the micro sign into the letter μ.
    form = _FORM.fullmatch(unicodedata.normalize("NFKC", text).strip())
    if form is None:
        return None
    head, index = form["head"], form["index"]
    code = _constellation_words().get(" ".join(form["rest"].casefold().split()))
    if code is None:
        return None
    if head.isdigit():
        return None if index else f"{int(head)} {code}"
    letter = _LETTER.get(head.casefold(), head if len(head) == 1 and head.isascii() else "")
    if not letter:
        return None
    return f"{letter}{int(index) if index else ''} {code}"


def simplified(text: str) -> str:
    """Return a name for comparison: no case, no accents, apostrophes or hyphens, single spaces."""
    plain = text.casefold()
    if not plain.isascii():
        import unicodedata

        plain = "".join(c for c in unicodedata.normalize("NFKD", plain) if not unicodedata.combining(c))
    return " ".join(_MARKS.sub("", plain).translate(_DASHES).split())
