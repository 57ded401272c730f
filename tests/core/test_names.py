"""Names of stars: every usual spelling finds the star, and what is not there is said with a near name."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from colure import designations, names, resources, stars
from colure.constellations import constellations
from colure.errors import ResourceError, TargetError


def hip(number: int) -> int:
    row = stars.catalogue().by_hip(number)
    assert row is not None
    return row


# Hipparcos numbers of the IAU Catalog of Star Names and of SIMBAD, from memory.
@pytest.mark.parametrize(
    ("text", "number"),
    [
        ("Aldebaran", 21421),
        ("  aldebaran ", 21421),
        ("alpha Tau", 21421),
        ("α Tau", 21421),
        ("alf Tau", 21421),
        ("ALPHA TAURI", 21421),
        ("HIP 21421", 21421),
        ("hip21421", 21421),
        ("TYC 1266-1416-1", 21421),
        ("tyc 1266 1416 1", 21421),
        ("61 Cyg", 104214),
        ("61 Cygni", 104214),
        ("Gaia DR3 4472832130942575872", 87937),
        ("barnards star", 87937),
        ("Barnard's Star", 87937),
        ("π4 Ori", 22549),
        ("pi-4 Ori", 22549),
        ("π⁴ Orionis", 22549),
        ("tet01 Eri", 13847),
        ("alpha Capricorni", 100064),  # α2, the brighter of the two
        ("alpha Canis Majoris", 32349),
        ("Algenib", 1067),  # γ Peg by the IAU; older lists gave the name to Mirfak
        ("Mirfak", 15863),
        ("Rigil Kentaurus", 71683),
        ("Proxima Centauri", 70890),
        ("α Cen", 71683),
        ("Polaris", 11767),
        ("eta Orionis", 25281),
        ("mu Cep", 107259),
    ],
)
def test_spellings(text: str, number: int) -> None:
    assert names.find(text) == hip(number)


def test_case_of_latin_letters_counts() -> None:
    assert names.find("p Pup") != names.find("P Pup")


def test_all_names_of_a_star() -> None:
    found = names.identify(hip(21421))
    assert found.every == ("Aldebaran", "α Tau", "HIP 21421", "TYC 1266-1416-1")
    assert found.best == "Aldebaran"
    faint = names.identify(len(stars.catalogue()) - 1)
    assert faint.best.startswith("TYC ")
    assert names.find(faint.best) == faint.row


def test_what_is_not_there_is_said() -> None:
    with pytest.raises(TargetError, match="did you mean 'Aldebaran'"):
        names.find("aldebran")
    with pytest.raises(TargetError, match=r"not among the .* Bayer letters"):
        names.find("99 Tau")
    with pytest.raises(TargetError, match=r"HIP 999999.*not in the catalogue"):
        names.find("HIP 999999")
    with pytest.raises(TargetError, match="not in the catalogue"):
        names.find("TYC 1-1-1")
    with pytest.raises(TargetError, match="G < 10"):
        names.find("Gaia DR3 99999999999999999999999")
    with pytest.raises(TargetError, match="in no list"):
        names.find("   ")


@given(st.text(max_size=40))
def test_any_text_gives_a_row_or_one_line(text: str) -> None:
    try:
        row = names.find(text)
    except TargetError:
        return  # any other exception fails the test
    assert 0 <= row < len(stars.catalogue())


@given(st.sampled_from([row[:2] for row in designations.GREEK]), st.integers(0, 9), st.sampled_from(constellations()))
def test_a_designation_has_one_printed_form(letter: tuple[str, str], index: int, entry: object) -> None:
    code, genitive = entry.code, entry.genitive
    number = str(index) if index else ""
    expected = f"{letter[0]}{number} {code}"
    assert designations.parse(expected) == expected
    assert designations.parse(f"{letter[1]} {number} {genitive}") == expected
    assert designations.parse(f"{letter[1].upper()}{number}_{code.lower()}") == expected


def test_texts_that_are_no_designation() -> None:
    for text in ("", "α", "α Xyz", "1000 Tau", "M 31", "beta-3 Nowhere", "12 34 Tau", "αβ Tau"):
        assert designations.parse(text) is None


def test_labels_come_brightest_first() -> None:
    for kind in ("proper", "bayer", "flamsteed"):
        rows, texts = names.labels(kind)
        assert len(rows) == len(texts) == len(np.unique(rows))
        assert np.all(np.diff(stars.catalogue().rows(rows).vmag) >= 0)
    rows, texts = names.labels("proper")
    assert len(rows) == 410
    assert texts[0] == "Sirius"
    rows, texts = names.labels("bayer")
    assert texts[list(rows).index(hip(13847))] == "θ1"


def test_every_bright_star_has_a_name() -> None:
    bright = stars.catalogue().brighter(3.0)
    unnamed = [row for row in bright.ids if names.identify(row).best.startswith(("HIP", "TYC", "Gaia", "star"))]
    # Companions of named stars that have no Hipparcos number of their own; the brightest is Castor B.
    assert all(bright.hip[list(bright.ids).index(row)] == 0 for row in unnamed)
    assert len(unnamed) < 5


def test_completion() -> None:
    found = names.search("ald")
    assert found[0] == ("Aldebaran", hip(21421))
    assert all(name.lower().startswith("ald") for name, _ in found)
    assert names.search("α Tau") == [("α Tau", hip(21421))]
    assert names.search("HIP 21421") == [("HIP 21421", hip(21421))]
    assert names.search("HIP 9999999") == []
    assert names.search("") == []


def test_a_damaged_table_is_one_clear_line(tmp_path, monkeypatch: pytest.MonkeyPatch) -> None:
    stars.catalogue().hip  # noqa: B018  (mapped before the folder is swapped)
    constellations()
    broken = tmp_path / "names.tsv"
    monkeypatch.setattr(resources, "path", lambda _: broken)
    for text in ("row\tproper\n12\tonly two", "row\nx\t\t\t\t", "row\n13\tA\t\t\t\n99999998\tB\t\t\t\n"):
        broken.write_text(text)
        names._table.cache_clear()
        with pytest.raises(ResourceError, match=r"names/names\.tsv"):
            names._table()
    names._table.cache_clear()
