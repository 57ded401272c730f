"""Deep-sky objects: published places and sizes, counts of the famous lists, and the search by name."""

import numpy as np
import pytest

from colure import deepsky, resources
from colure.arrays import DEG, cartesian, separation
from colure.errors import ResourceError, TargetError


# J2000.0 places as NED and SIMBAD print them, from memory; extended objects have no centre to better than 1′.
@pytest.mark.parametrize(
    ("name", "ra_deg", "dec_deg", "kind"),
    [
        ("M 31", 10.6847, 41.2690, "galaxy"),
        ("M 1", 83.633, 22.0145, "supernova remnant"),
        ("M 13", 250.4235, 36.4613, "globular cluster"),
        ("M 45", 56.75, 24.12, "open cluster"),
        ("M 57", 283.396, 33.029, "planetary nebula"),
        ("NGC 253", 11.888, -25.288, "galaxy"),
        ("NGC 7293", 337.411, -20.837, "planetary nebula"),
        ("IC 434", 85.25, -2.45, "ionised region"),
    ],
)
def test_published_places(name: str, ra_deg: float, dec_deg: float, kind: str) -> None:
    row = deepsky.find(name)
    limit = 20.0 if kind in {"open cluster", "ionised region"} else 1.0
    apart = separation(deepsky.everything().vectors[row], cartesian(ra_deg * DEG, dec_deg * DEG)) / DEG * 60
    assert apart < limit
    assert deepsky.type_of(row) == kind


def test_the_crab_has_its_catalogued_size() -> None:
    # M 1 is the pulsar's nebula, 6′ × 4′ in most lists, 8′ × 4′ in this one; V 8.4 (SEDS, from memory).
    crab = deepsky.everything().take(np.array([deepsky.find("Crab Nebula")]))
    assert crab.size_arcmin[0] == pytest.approx([7.0, 4.0], abs=1.0)
    assert crab.magnitude[0] == pytest.approx(8.4, abs=0.2)


def test_counts() -> None:
    # The NGC has 7,840 entries and the IC 5,386 (Dreyer 1888–1908); M 102 is M 101 again.
    every = deepsky.everything()
    messier = every.data["messier"]
    assert sorted(messier[messier > 0]) == [m for m in range(1, 111) if m != 102]
    assert len(deepsky.catalogue()) == 12_162 + 2  # M 40 is a double star, M 73 an asterism
    assert np.all(np.isfinite(every.vectors))
    found = sum(any(name.startswith("NGC ") for name in deepsky.names(k)) for k in range(len(every)))
    assert found > 7000


def test_hidden_kinds_are_hidden_but_found() -> None:
    row = deepsky.find("NGC 1990")  # the glow about a star that is not there
    assert row not in deepsky.catalogue().ids
    assert deepsky.find("M 40") in deepsky.catalogue().ids  # a double star, and Messier's all the same


@pytest.mark.parametrize(
    ("text", "name"),
    [
        ("m31", "M 31"),
        ("Messier 31", "M 31"),
        ("ngc 224", "M 31"),
        ("NGC0224", "M 31"),
        ("andromeda galaxy", "M 31"),
        ("M102", "M 101"),
        ("Pleiades", "M 45"),
        ("IC 11", "NGC 281"),
        ("Witch Head Nebula", "NGC 1909"),
    ],
)
def test_spellings(text: str, name: str) -> None:
    assert deepsky.names(deepsky.find(text))[0] == name


def test_what_is_not_there_is_said() -> None:
    with pytest.raises(TargetError, match="did you mean 'Andromeda Galaxy'"):
        deepsky.find("andromida galaxy")
    for text in ("M 111", "NGC 9999", "", "  "):
        with pytest.raises(TargetError, match="expected an M, NGC or IC number"):
            deepsky.find(text)


def test_cut_is_sorted_and_keeps_messier() -> None:
    cut = deepsky.brighter(9.0)
    assert np.all((cut.magnitude < 9.0) | (cut.data["messier"] > 0))
    assert np.count_nonzero(cut.data["messier"]) == 109
    bare = deepsky.brighter(9.0, messier=False)
    assert np.all(np.diff(bare.magnitude) >= 0)
    assert len(bare.labels) == len(bare)
    assert "M 31" in bare.labels


def test_unknown_values_are_nan() -> None:
    every = deepsky.everything()
    assert np.isnan(every.position_angle).any()
    angle = every.position_angle[np.isfinite(every.position_angle)]
    assert angle.min() >= 0
    assert angle.max() <= np.pi + 1e-9  # an axis has no head: 0° to 180°
    sizes = every.size_arcmin
    known = np.isfinite(sizes[:, 0])
    assert np.all(sizes[known, 0] >= sizes[known, 1])


def test_completion() -> None:
    assert deepsky.search("whirl")[0][0].startswith("Whirlpool")
    assert ("NGC 7293", deepsky.find("NGC 7293")) in deepsky.search("ngc 729")
    assert deepsky.search("") == []


def test_damaged_files_are_one_clear_line(tmp_path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(resources, "root", lambda: tmp_path)
    (tmp_path / "deepsky").mkdir()
    deepsky.everything.cache_clear()
    np.save(tmp_path / "deepsky" / "objects.npy", np.zeros(4))
    with pytest.raises(ResourceError, match=r"objects\.npy.*expected"):
        deepsky.everything()
    np.save(tmp_path / "deepsky" / "objects.npy", np.zeros(4, dtype=deepsky.ROW))
    (tmp_path / "deepsky" / "names.tsv").write_text("name\tcommon\talso\nM 1\t\t\n")
    deepsky._names.cache_clear()
    with pytest.raises(ResourceError, match="1 names, expected 4"):
        deepsky._names()
    (tmp_path / "deepsky" / "names.tsv").write_text("name\nM 1\n")
    with pytest.raises(ResourceError, match=r"names\.tsv"):
        deepsky._names()
    deepsky.everything.cache_clear()
