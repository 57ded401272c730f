"""Tables: the four formats there and back, refused rows, and files that are no tables."""

import io
from pathlib import Path

import numpy as np
import pytest
from astropy.io import fits
from astropy.io.votable import parse_single_table
from astropy.table import MaskedColumn
from astropy.table import Table as AstropyTable
from hypothesis import given
from hypothesis import strategies as st

from colure import tables
from colure.errors import TableError
from colure.tables import Column, Table
from colure.tables.csvfile import typed

SAMPLE = Table(
    (
        Column("lon_deg", np.array([0.1, 359.987654321012345, np.nan]), "deg", "pos.eq.ra", "right ascension"),
        Column("lat_deg", np.array([-0.0, 1e-300, 12.5]), "deg"),
        Column("count", np.array([1, -2, 2**60], dtype=np.int64)),
        Column("name", np.array(["α, Tau", 'say "x"', ""])),
    ),
    {"frame": "equator/mean/J2000", "place": "apparent"},
)


def _write(tmp_path: Path, text: str | bytes, name: str = "t.csv") -> Path:
    path = tmp_path / name
    path.write_bytes(text.encode() if isinstance(text, str) else text)
    return path


@pytest.mark.parametrize("form", tables.FORMATS)
def test_there_and_back(form: str) -> None:
    back = tables.read_bytes(tables.dumps(SAMPLE, form)).table
    assert back.names == SAMPLE.names
    for column in SAMPLE:
        got = back.column(column.name).values
        if not column.is_text:
            assert np.array_equal(got, column.values, equal_nan=True), column.name
        elif form == "fits":  # ASCII only
            assert got.tolist() == ["\\u03b1, Tau", 'say "x"', ""]
        else:
            assert got.tolist() == column.values.tolist()
    if form != "csv":
        assert back.column("lon_deg").unit == "deg"
    if form in ("csv", "ecsv"):
        assert dict(back.meta) == dict(SAMPLE.meta)


def test_other_software_reads_what_is_written() -> None:
    """astropy's own readers as the other side."""
    vot = parse_single_table(io.BytesIO(tables.dumps(SAMPLE, "votable")))
    field = vot.get_field_by_id_or_name("lon_deg")
    assert (str(field.unit), field.ucd, field.description) == ("deg", "pos.eq.ra", "right ascension")
    assert [(info.name, info.value) for info in vot.infos] == list(SAMPLE.meta.items())
    with fits.open(io.BytesIO(tables.dumps(SAMPLE, "fits"))) as units:
        assert units[1].columns["lon_deg"].unit == "deg"
        assert "frame = equator/mean/J2000" in str(units[1].header["COMMENT"])
    ecsv = AstropyTable.read(tables.dumps(SAMPLE, "ecsv").decode(), format="ascii.ecsv")
    assert ecsv.meta == SAMPLE.meta


def test_masked_and_odd_columns_from_other_software(tmp_path: Path) -> None:
    source = AstropyTable()
    source["ra"] = MaskedColumn([1.0, 2.0, 3.0], mask=[False, True, False], unit="deg")
    source["n"] = MaskedColumn([1, 2, 3], mask=[False, False, True])
    source["id"] = np.array([b"a", b"bb", b"c"])
    source["matrix"] = np.zeros((3, 2))
    source["flag"] = [True, False, True]
    for form in ("fits", "votable"):
        path = tmp_path / f"t.{form}"
        source.write(path, format=form)
        read = tables.read(path)
        assert np.array_equal(read.table.column("RA").values, [1.0, np.nan, 3.0], equal_nan=True)
        assert read.table.column("n").values.tolist()[:2] == [1, 2]
        assert read.table.column("id").values.tolist() == ["a", "bb", "c"]
        assert "matrix" not in read.table.names
        assert any("'matrix' was left out" in note for note in read.notes)


def test_csv_as_people_write_it() -> None:
    text = "\ufeff# frame = icrs\n# a remark\n\nname;ra [deg];dec (deg)\n'x';10,5;1\n# within\nb;3;4\n"
    read = tables.read_bytes(text.encode())
    assert dict(read.table.meta) == {"frame": "icrs"}
    assert read.table.names == ("name", "ra", "dec")
    assert read.table.column("ra").unit == "deg"
    assert read.table.column("ra").values.tolist() == ["10,5", "3"]
    assert read.table.column("dec").values.tolist() == [1, 4]


def test_types_of_cells() -> None:
    assert typed(["1", " 2"]).dtype == np.int64
    assert typed(["1", ""]).dtype == np.float64
    assert typed(["1.5", "nan", "--"]).tolist()[0] == 1.5
    assert typed(["007", "1"]).dtype.kind == "U"
    assert typed(["12345678901234567890"]).dtype.kind == "U"
    assert typed(["6917528997577384320"]).tolist() == [6917528997577384320]
    assert typed(["6917528997577384320", ""]).dtype.kind == "U"
    assert typed(["1_000"]).dtype.kind == "U"
    assert typed(["12 34 56"]).dtype.kind == "U"


@given(
    st.lists(
        st.tuples(st.floats(allow_nan=True, allow_infinity=True), st.text(st.characters(codec="utf-8"), max_size=12)),
        min_size=1,
        max_size=8,
    )
)
def test_any_floats_and_texts_survive_csv(rows: list[tuple[float, str]]) -> None:
    numbers = np.array([number for number, _ in rows])
    texts = np.array([text.strip().replace("\x00", "").replace("\r", "").replace("\n", "") + "." for _, text in rows])
    back = tables.read_bytes(tables.dumps(Table((Column("x", numbers), Column("t", texts))), "csv")).table
    assert np.array_equal(back.column("x").values.astype(float), numbers, equal_nan=True)
    if back.column("t").is_text:
        assert back.column("t").values.tolist() == [text.strip() for text in texts.tolist()]


@given(st.binary(max_size=300))
def test_any_bytes_are_a_table_or_refused_in_one_line(data: bytes) -> None:
    try:
        tables.read_bytes(data)
    except TableError as error:
        lines = str(error).splitlines()
    else:
        lines = ["read"]
    assert len(lines) == 1


def test_rows_that_cannot_be_used_are_listed(tmp_path: Path) -> None:
    path = _write(tmp_path, "id,ra,dec\na,1,2\nb,3\nc,nan,4\nd,5,95\ne,,6\nf,400,0\ng,7,8\nh,x,9\ni,inf,1\n")
    with pytest.raises(TableError) as caught:
        tables.read_positions(path)
    assert "1 of 9 rows cannot be used: row 2: 2 cells; the header has 3" in str(caught.value)
    assert "--skip-bad" in str(caught.value)
    got = tables.read_positions(path, skip_bad=True)
    assert got.table.column("id").values.tolist() == ["a", "g"]
    assert got.lon_deg.tolist() == [1.0, 7.0]
    assert got.lat_deg.tolist() == [2.0, 8.0]
    assert got.table.names == ("id", "ra", "dec")
    assert [line.split(":")[0] for line in got.rejected] == [f"row {i}" for i in (2, 3, 4, 5, 6, 8, 9)]
    reasons = " ".join(got.rejected)
    assert "dec 95° is outside −90° to 90°" in reasons
    assert "ra is missing" in reasons
    assert "400°" in reasons


def test_numbers_out_of_range_in_a_clean_table(tmp_path: Path) -> None:
    path = _write(tmp_path, "lon,lat\n-10,0\n360,0\n1,-91\n")
    with pytest.raises(TableError, match="row 3: lat −91° is outside"):
        tables.read_positions(path)
    assert tables.read_positions(path, skip_bad=True).lon_deg.tolist() == [350.0, 0.0]
    with pytest.raises(TableError, match="1 of 1 rows"):
        tables.read_positions(_write(tmp_path, "lon,lat\n1,-91\n"), skip_bad=True)


def test_units_of_coordinate_columns(tmp_path: Path) -> None:
    assert tables.read_positions(_write(tmp_path, "ra [h],dec\n12,1\n")).lon_deg.tolist() == [180.0]
    radians = tables.read_positions(_write(tmp_path, "ra [rad],dec [rad]\n3.141592653589793,-0.5\n"))
    assert radians.lon_deg.tolist() == [180.0]
    assert radians.lat_deg[0] == pytest.approx(-28.64788975654116, abs=1e-12)
    with pytest.raises(TableError, match="is in 'furlong'"):
        tables.read_positions(_write(tmp_path, "ra [furlong],dec\n12,1\n"))
    sexagesimal = "{},dec\n12 34 56.7,-00 12 03\n12:00:00,+01:30\n"
    with pytest.raises(TableError, match="hours or degrees"):
        tables.read_positions(_write(tmp_path, sexagesimal.format("ra")), equatorial=True)
    hours = tables.read_positions(_write(tmp_path, sexagesimal.format('"ra [h:m:s]"')), equatorial=True)
    assert hours.lon_deg == pytest.approx([188.73625, 180.0], abs=1e-9)
    assert hours.lat_deg == pytest.approx([-(12 / 60 + 3 / 3600), 1.5], abs=1e-12)
    marked = tables.read_positions(_write(tmp_path, "ra,dec\n12h34m56.7s,-0°12′03″\n"), equatorial=True)
    assert marked.lon_deg == pytest.approx([188.73625], abs=1e-9)


def test_columns_are_found_or_named(tmp_path: Path) -> None:
    path = _write(tmp_path, "RAJ2000,DEJ2000,alt_lon,alt_lat\n1,2,3,4\n")
    assert tables.read_positions(path).lon_name == "RAJ2000"
    assert tables.read_positions(path, lon="alt_lon", lat="ALT_LAT").lat_deg.tolist() == [4.0]
    with pytest.raises(TableError, match="did you mean 'alt_lon'"):
        tables.read_positions(path, lon="alt_lom")
    with pytest.raises(TableError, match=r"no column of longitudes.*it has a, b.*--lon"):
        tables.read_positions(_write(tmp_path, "a,b\n1,2\n"))


def test_added_columns_keep_the_old_ones() -> None:
    table = SAMPLE.with_columns({"lon_deg": (np.zeros(3), "deg")}, meta={"frame": "icrs"})
    assert table.names == ("from_lon_deg", "lat_deg", "count", "name", "lon_deg")
    assert table.meta["frame"] == "icrs"
    with pytest.raises(TableError, match="one length"):
        table.with_columns({"x": (np.zeros(2), "")})


@pytest.mark.parametrize(
    ("data", "reason"),
    [
        (b"", "empty"),
        (b" \n\n", "empty"),
        (b"# only a remark\n", "empty; expected a header"),
        (b"a,b\n", "no rows"),
        (b"1,2\n3,4\n", "header line with the columns' names"),
        (b"a,a\n1,2\n", "two columns are named 'a'"),
        (b"a,b\n\xff\xfe,1\n", "line 2 is not UTF-8"),
        (b"a,b\n\x00,1\n", "null characters"),
        (b"a,b\n" + b"x" * 20000 + b",1\n", "field larger"),
        (b",".join(b"c%d" % i for i in range(2000)) + b"\n", "2000 columns"),
        (b"\x1f\x8b" + b"x" * 20, "compressed by gzip"),
        (b"SIMPLE  =                    T", "no readable FITS"),
        (b"<?xml version='1.0'?><VOTABLE></VOTABLE>", "no table"),
        (b"<?xml version='1.0'?><VOTABLE><RESOURCE>", "no readable VOTable"),
        (b"<!DOCTYPE x [<!ENTITY a 'b'>]><VOTABLE/>", "DOCTYPE declaration, which is not read"),
        (b"<VOTABLE><STREAM encoding='base64' href='http://example.org/x'/></VOTABLE>", "not followed"),
        ("<VOTABLE/>".encode("utf-16"), "UTF-8"),
        (b"# %ECSV 1.0\n# ---\n# datatype: [\n", "no readable ECSV"),
    ],
)
def test_files_that_are_no_tables_say_why(data: bytes, reason: str) -> None:
    with pytest.raises(TableError, match=reason) as caught:
        tables.read_bytes(data, "table 'x'")
    assert len(str(caught.value).splitlines()) == 1


@pytest.mark.parametrize("form", ["votable", "fits"])
def test_truncated_files_are_refused(form: str) -> None:
    whole = tables.dumps(Table((Column("x", np.arange(5000.0)),)), form)
    for part in (0.3, 0.6, 0.9):
        with pytest.raises(TableError):
            tables.read_bytes(whole[: int(len(whole) * part)])


def test_sizes_are_bounded(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = _write(tmp_path, "a\n" + "1\n" * 100)
    with pytest.raises(TableError, match="more than 50 bytes"):
        tables.read(path, limit=50)
    monkeypatch.setattr("colure.tables.csvfile.MOST_ROWS", 99)
    with pytest.raises(TableError, match="more than 99 rows"):
        tables.read(path)
    with pytest.raises(TableError, match="no such file"):
        tables.read(tmp_path / "none.csv")
    data = tables.dumps(Table((Column("x", np.arange(3.0)),)), "fits")
    with pytest.raises(TableError, match=r"expected at most|cut short"):
        tables.read_bytes(data.replace(b"NAXIS2  =                    3", b"NAXIS2  =         999999999999"))


def test_written_by_ending(tmp_path: Path) -> None:
    for ending in ("csv", "ecsv", "vot", "xml", "fits"):
        path = tmp_path / f"t.{ending}"
        tables.write(SAMPLE, path)
        assert len(tables.read(path).table) == 3
    with pytest.raises(TableError, match="names no format"):
        tables.write(SAMPLE, tmp_path / "t.doc")
    with pytest.raises(TableError, match="did you mean 'csv'"):
        tables.dumps(SAMPLE, "cvs")
