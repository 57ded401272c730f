"""Tables as overlays: columns, units and frames by rule, what must be asked, and files that nobody should trust."""

import warnings
from pathlib import Path
from typing import Any

import astropy
import astropy.units as u
import numpy as np
import pytest
from astropy.coordinates import SkyCoord
from astropy.io import fits
from astropy.io.votable import parse_single_table
from astropy.table import Table as AstropyTable

from colure.arrays import ARCSEC, DEG, MAS, cartesian, separation
from colure.overlays import Overlay, OverlayError, columns, directions, opening
from colure.overlays.store import Store

DATA = Path(astropy.__file__).parent / "io/votable/tests/data"


def _file(tmp_path: Path, text: str | bytes, name: str = "t.csv") -> Path:
    path = tmp_path / name
    path.write_bytes(text.encode() if isinstance(text, str) else text)
    return path


def _votable(fields: str, head: str = "", row: str = "<TD>10.5</TD><TD>-20.25</TD>") -> str:
    return (
        '<?xml version="1.0"?><VOTABLE version="1.4" xmlns="http://www.ivoa.net/xml/VOTable/v1.3"><RESOURCE>'
        f"{head}<TABLE>{fields}<DATA><TABLEDATA><TR>{row}</TR></TABLEDATA></DATA></TABLE></RESOURCE></VOTABLE>"
    )


def _fields(
    ref: str = "", lon: str = "pos.eq.ra;meta.main", lat: str = "pos.eq.dec;meta.main", names: Any = None
) -> str:
    a, b = names or ("x", "y")
    at = f' ref="{ref}"' if ref else ""
    return (
        f'<FIELD name="{a}" ucd="{lon}" datatype="double" unit="deg"{at}/>'
        f'<FIELD name="{b}" ucd="{lat}" datatype="double" unit="deg"{at}/>'
    )


@pytest.mark.parametrize(
    "name", ["valid_votable.xml", "coosys.xml", "names.xml", "vizier_b2_votable.xml", "irsa-nph-m31.xml"]
)
def test_real_votables_agree_with_astropy(name: str) -> None:
    """Tables of astropy's installed test data; their frames are named by COOSYS."""
    store = Store()
    overlay = opening.open_file(DATA / name, store=store)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        table = parse_single_table(DATA / name).to_table(use_names_over_ids=True)
    peer_frame = "icrs" if overlay.frame == "icrs" else "fk5"
    assert overlay.frame in ("icrs", "equator/mean/J2000@iau1976")
    peer = SkyCoord(
        np.asarray(table[overlay.lon], float) * u.deg, np.asarray(table[overlay.lat], float) * u.deg, frame=peer_frame
    ).icrs
    mine = directions.of(overlay, store=store)
    assert mine is not None
    assert len(mine) == len(peer) > 0
    assert separation(mine, cartesian(peer.ra.rad, peer.dec.rad)).max() < 1.0 * MAS


def test_a_named_document_type_is_not_fetched(monkeypatch: pytest.MonkeyPatch) -> None:
    """A table of another service that names its DTD by an address on the network."""
    import socket

    def refuse(*_: object, **__: object) -> None:
        raise AssertionError("a connection was tried")

    monkeypatch.setattr(socket.socket, "connect", refuse)
    assert b"<!DOCTYPE VOTABLE SYSTEM" in (DATA / "irsa-nph-m31.xml").read_bytes()
    assert opening.inspect(DATA / "irsa-nph-m31.xml").total > 0


@pytest.mark.parametrize(
    ("frame", "words", "name"),
    [
        ("icrs", {}, "icrs"),
        ("fk5", {"equinox": "J1975"}, "equator/mean/J1975@iau1976"),
        ("fk4", {"equinox": "B1950"}, "equator/fk4/B1950"),
        ("galactic", {}, "galactic"),
    ],
)
def test_coordinates_that_astropy_wrote_into_ecsv(tmp_path: Path, frame: str, words: dict[str, str], name: str) -> None:
    from astropy.table import QTable

    coordinates = SkyCoord([10.5, 200.0] * u.deg, [-20.0, 45.0] * u.deg, frame=frame, **words)
    path = tmp_path / "t.ecsv"
    QTable({"c": coordinates, "k": [1, 2]}).write(path)
    overlay = opening.open_file(path, store=(store := Store()))
    assert overlay.frame == name
    assert "frame = " in overlay.rule
    mine = directions.of(overlay, store=store)
    assert mine is not None
    peer = coordinates.icrs
    # FK5 of 1975: astropy precesses by IAU 2006, FK5 is defined with IAU 1976, 0.3″ a century apart; FK4 and the
    # galactic pole differ by definition by 3 and 30 mas (see the corners of images).
    apart = {"fk5": 100.0, "fk4": 3.0, "galactic": 30.0}.get(frame, 0.001)
    assert separation(mine, cartesian(peer.ra.rad, peer.dec.rad)).max() < apart * MAS


SYSTEMS = [
    # VOTable 1.4, section 3.1, and the IVOA vocabulary of reference frames.
    ('system="ICRS"', _fields("s"), "icrs"),
    ('system="ICRS" equinox="J2000" epoch="J2015.5"', _fields("s"), "icrs"),
    ('system="eq_FK5" equinox="J2000"', _fields("s"), "equator/mean/J2000@iau1976"),
    ('system="FK5"', _fields("s"), "equator/mean/J2000@iau1976"),
    ('system="eq_FK4" equinox="B1950"', _fields("s"), "equator/fk4/B1950"),
    ('system="FK4" equinox="B1875"', _fields("s"), "equator/fk4/B1875"),
    (
        'system="ecl_FK5" equinox="J2000"',
        _fields("s", "pos.ecliptic.lon", "pos.ecliptic.lat"),
        "ecliptic/mean/J2000@iau1976",
    ),
    ('system="ICRS"', _fields("s", "pos.ecliptic.lon", "pos.ecliptic.lat"), "ecliptic/mean/J2000"),
    ('system="galactic"', _fields("s", "pos.galactic.lon", "pos.galactic.lat"), "galactic"),
]


@pytest.mark.parametrize(("attributes", "fields", "frame"), SYSTEMS)
def test_coosys_decides(tmp_path: Path, attributes: str, fields: str, frame: str) -> None:
    path = _file(tmp_path, _votable(fields, f'<COOSYS ID="s" {attributes}/>'), "t.xml")
    found = opening.inspect(path)
    assert found.complete, found.missing
    assert found.frame == frame
    assert found.rules["frame"].startswith("COOSYS ")
    assert found.epoch == (2015.5 if "2015.5" in attributes else None)


@pytest.mark.parametrize(
    ("text", "keys", "says"),
    [
        (_votable(_fields()), ["frame"], "the file names no frame"),
        (_votable(_fields("s"), '<COOSYS ID="s" system="UNKNOWN"/>'), ["frame"], "names no frame of the sky"),
        (_votable(_fields("s"), '<COOSYS ID="s" system="BODY"/>'), ["frame"], "names no frame of the sky"),
        (
            _votable(_fields(), '<COOSYS ID="s" system="ICRS"/><COOSYS ID="q" system="FK4"/>'),
            ["frame"],
            "the file names no frame",
        ),
        ("ra,dec\n10.0,5\n20,6\n", ["lon_unit", "frame"], "hours or degrees?"),
        ("ra,dec\n110.0,5\n20,6\n", ["frame"], "which frame"),
        ("ra [h],dec [deg]\n11.0,5\n", ["frame"], "which frame"),
        ("ra,dec\n12 30 00,5 0 0\n", ["lon_unit", "frame"], "hours or degrees?"),
        ("ra,dec\n12h30m00s,5 0 0\n", ["frame"], "which frame"),
        ("elon,elat\n12,5\n", ["frame"], "ecliptic"),
        ("a,b\n1,2\n", ["lon", "lat"], "it has a, b"),
    ],
)
def test_what_a_file_does_not_say_is_asked(tmp_path: Path, text: str, keys: list[str], says: str) -> None:
    found = opening.inspect(_file(tmp_path, text, "t.dat"))
    assert [miss.key for miss in found.missing] == keys
    assert any(says in miss.question for miss in found.missing)
    assert all(miss.choices for miss in found.missing)
    with pytest.raises(OverlayError) as caught:
        opening.declare(found)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    ("header", "frame", "rule"),
    [
        ("RAJ2000 [deg],DEJ2000 [deg]", "equator/mean/J2000@iau1976", "the name 'RAJ2000' states equinox J2000"),
        ("RA_ICRS [deg],DE_ICRS [deg]", "icrs", "states ICRS"),
        ("RAB1950 [deg],DEB1950 [deg]", "equator/fk4/B1950", "B1950"),
        ("GLON [deg],GLAT [deg]", "galactic", "galactic"),
    ],
)
def test_names_that_state_a_frame(tmp_path: Path, header: str, frame: str, rule: str) -> None:
    found = opening.inspect(_file(tmp_path, f"{header}\n10.5,-3\n"))
    assert (found.complete, found.frame) == (True, frame)
    assert rule in found.rules["frame"]


def test_a_frame_in_a_remark_is_read(tmp_path: Path) -> None:
    found = opening.inspect(
        _file(tmp_path, "# frame = ecliptic/mean/B1950\n# epoch = J1991.25\nlon_deg,lat_deg\n1,2\n")
    )
    assert (found.frame, found.epoch) == ("ecliptic/mean/B1950", 1991.25)
    wrong = opening.inspect(_file(tmp_path, "# frame = eclptic\nlon_deg,lat_deg\n1,2\n"))
    assert [miss.key for miss in wrong.missing] == ["frame"]
    assert "eclptic" in wrong.missing[0].question


def test_the_header_of_a_fits_table_decides_as_that_of_an_image(tmp_path: Path) -> None:
    table = AstropyTable({"RA": [10.5], "DEC": [-20.0]})
    table["RA"].unit = table["DEC"].unit = "deg"
    for cards, frame in (({"EQUINOX": 1950.0}, "equator/fk4/B1950"), ({"RADESYS": "ICRS"}, "icrs"), ({}, None)):
        unit = fits.table_to_hdu(table)
        unit.header.update(cards)
        path = tmp_path / "t.fits"
        fits.HDUList([fits.PrimaryHDU(), unit]).writeto(path, overwrite=True)
        found = opening.inspect(path)
        assert found.kind == "table"
        assert found.frame == frame
        assert found.complete is (frame is not None)  # nothing by default: a table's header need not be about its sky


def test_ucds_of_errors_and_motions_are_no_positions() -> None:
    from colure.tables import Column, Table

    numbers = np.array([1.0])
    table = Table(
        (
            Column("e_ra", numbers, "deg", "stat.error;pos.eq.ra"),
            Column("pm", numbers, "mas/yr", "pos.pm;pos.eq.ra"),
            Column("r2", numbers, "deg", "pos.eq.ra"),
            Column("d2", numbers, "deg", "pos.eq.dec"),
            Column("r1", numbers, "deg", "POS_EQ_RA_MAIN"),
            Column("d1", numbers, "deg", "POS_EQ_DEC_MAIN"),
        )
    )
    assert [(pair.lon, pair.lat) for pair in columns.pairs(table)] == [("r1", "d1"), ("r2", "d2")]


def test_declared_columns_units_and_frame_reach_the_directions(tmp_path: Path) -> None:
    path = _file(tmp_path, "a,b,n\n6.0,10.0,first\n12.0,-10.0,second\n")
    store = Store()
    overlay = opening.declare(
        opening.inspect(path), lon="a", lat="b", lon_unit="h", frame="icrs", epoch=1990.0, name="n", store=store
    )
    v = directions.of(overlay, store=store)
    assert v is not None
    assert np.allclose(v, cartesian(np.array([90.0, 180.0]) * DEG, np.array([10.0, -10.0]) * DEG), atol=1e-15)
    assert overlay.rule == "declared by the user"
    rows = store.rows(overlay)
    assert rows is not None
    assert rows.texts("n") == ("first", "second")
    with pytest.raises(ValueError, match="read-only"):
        rows.lon[0] = 0.0


def test_a_changed_frame_moves_the_overlay(tmp_path: Path) -> None:
    from dataclasses import replace

    store = Store()
    overlay = opening.open_file(_file(tmp_path, "ra_deg,dec_deg\n100.0,0.0\n"), frame="icrs", store=store)
    moved = directions.of(replace(overlay, frame="equator/fk4/B1950"), store=store)
    here = directions.of(overlay, store=store)
    assert here is not None
    assert moved is not None
    # Precession in right ascension 1950-2000 is 46.1″ a year on the equator (3.075 s a year; Explanatory Supplement).
    assert separation(moved[0], here[0]) / ARCSEC == pytest.approx(50 * 50.3 * 0.917, rel=0.03)


def test_bad_rows_are_listed_by_their_number_and_the_rest_is_taken(tmp_path: Path) -> None:
    text = "ra_deg,dec_deg\n10,5\nnan,3\n20,95\n30\n40,-5\nx,1\n"
    path = _file(tmp_path, text.replace("x,1\n", ""))
    store = Store()
    overlay = opening.open_file(path, frame="icrs", store=store)
    rows = store.rows(overlay)
    assert rows is not None
    assert rows.numbers.tolist() == [1, 5]
    assert [line.partition(":")[0] for line in rows.rejected] == ["row 2", "row 3", "row 4"]
    assert rows.refused == 3


HOSTILE: list[tuple[str, str | bytes, str]] = [
    ("a NaN column", "ra_deg,dec_deg\nnan,1\nnan,2\n", "cannot be used"),
    ("a million columns", ",".join(f"c{i}" for i in range(1_000_000)) + "\n", "columns; expected at most"),
    ("mixed encodings", "ra_deg,dec_deg,name\n1,2,α\n".encode() + "3,4,é\n".encode("latin-1"), "not UTF-8"),
    ("null bytes", b"ra,dec\n1,\x002\n", "null characters"),
    (
        "entities",
        '<?xml version="1.0"?><!DOCTYPE v [<!ENTITY a "aaaa"><!ENTITY b "&a;&a;">]><VOTABLE>&b;</VOTABLE>',
        "not read",
    ),
    (
        "data elsewhere",
        _votable(_fields()).replace("<TABLEDATA>", '<BINARY><STREAM href="file:///etc/passwd"/>'),
        "elsewhere",
    ),
    ("nothing", b"", "empty"),
    ("packed", b"PK\x03\x04" + b"x" * 100, "compressed"),
]


@pytest.mark.parametrize(("what", "data", "says"), HOSTILE, ids=[row[0] for row in HOSTILE])
def test_files_that_nobody_should_trust_get_one_line(tmp_path: Path, what: str, data: str | bytes, says: str) -> None:
    path = _file(tmp_path, data)
    with pytest.raises(OverlayError) as caught:
        opening.open_file(path, frame="icrs", store=Store())
    assert says in str(caught.value)
    assert "\n" not in str(caught.value)
    assert len(str(caught.value)) < 500


def test_a_fits_table_that_claims_two_gigabytes_is_refused(tmp_path: Path) -> None:
    unit = fits.table_to_hdu(AstropyTable({"RA": [1.0], "DEC": [2.0]}))
    path = tmp_path / "t.fits"
    fits.HDUList([fits.PrimaryHDU(), unit]).writeto(path)
    data = path.read_bytes()
    old = b"NAXIS2  =                    1"
    assert old in data
    path.write_bytes(data.replace(old, b"NAXIS2  =            134217728"))
    with pytest.raises(OverlayError, match=r"rows; expected at most|cut short|no readable"):
        opening.inspect(path, "table")


def test_a_missing_or_changed_file_is_a_state_and_not_a_fault(tmp_path: Path) -> None:
    path = _file(tmp_path, "ra_deg,dec_deg\n10,5\n")
    overlay = opening.open_file(path, frame="icrs", store=Store())
    store = Store()
    path.rename(tmp_path / "elsewhere.csv")
    assert store.rows(overlay) is None
    assert "cannot be read" in store.fault(overlay)
    assert directions.of(overlay, store=store) is None
    path.write_text("ra_deg,dec_deg\n11,5\n", encoding="ascii")
    assert store.rows(overlay) is None  # remembered until it is asked for anew
    before = store.generation
    store.retry()
    assert store.generation > before
    assert store.rows(overlay) is None
    assert "has changed" in store.fault(overlay)
    (tmp_path / "elsewhere.csv").replace(path)
    store.retry()
    assert store.rows(overlay) is not None
    assert store.fault(overlay) == ""


@pytest.mark.parametrize(
    ("changed", "says"),
    [
        ({"sha256": "abc"}, "overlays.sha256"),
        ({"frame": "nowhere"}, "overlays.frame"),
        ({"kind": "film"}, "overlays.kind"),
        ({"epoch": float("nan")}, "overlays.epoch"),
        ({"colour": "red"}, "overlays.colour"),
        ({"enlarge": 0.0}, "overlays.enlarge"),
        ({"lon": ""}, "needs its columns"),
        ({"hdu": -1}, "overlays.hdu"),
    ],
)
def test_an_overlay_checks_its_fields(changed: dict[str, Any], says: str) -> None:
    good: dict[str, Any] = {"path": "a.csv", "sha256": "0" * 64, "frame": "icrs", "lon": "ra", "lat": "dec"}
    assert Overlay(**good).title == "a.csv"
    with pytest.raises(OverlayError, match=says):
        Overlay(**{**good, **changed})
