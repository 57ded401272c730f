"""The command line: what it prints, in which form, with which exit code, and how it takes bad input."""

import csv
import io
import math
import subprocess
import sys
from pathlib import Path

import erfa
import numpy as np
import pytest


def test_help_lists_every_command_and_imports_none(colure):
    ran = colure("--help")
    assert ran.code == 0
    for name in ("chart", "where", "convert", "time", "obliquity", "selfcheck", "bench"):
        assert f"\n  {name} " in ran.out


def test_commands_without_a_chart_import_no_qt():
    code = (
        "import sys; from colure_viewer.cli.main import main; main(['where', 'mars', '--at', '2026-12-01']);"
        "bad = [m for m in ('PySide6', 'shiboken6', 'pyqtgraph', 'astropy') if m in sys.modules]; sys.exit(bool(bad))"
    )
    assert subprocess.run([sys.executable, "-c", code], capture_output=True).returncode == 0


# where


def test_where_json_carries_the_keys_of_the_documentation(colure):
    ran = colure("where", "mars", "moon", "--at", "2026-12-01 21:36", "--format", "json")
    assert ran.code == 0
    assert [record["body"] for record in ran.records] == ["mars", "moon"]
    keys = {
        *("utc", "tt_jd", "ut1_jd", "delta_t_s", "calendar", "frame", "place", "origin", "lon_deg", "lat_deg"),
        *("distance_au", "light_time_s", "rate_lon_arcsec_h", "rate_lat_arcsec_h", "pa_deg", "elongation_deg"),
        *("phase_angle_deg", "illuminated", "magnitude", "diameter_arcsec", "constellation", "ephemeris"),
        "uncertainty_arcsec",
    }
    for record in ran.records:
        assert keys <= set(record)
        assert record["frame"] == "icrs"
        assert record["place"] == "astrometric"
        assert record["origin"] == "earth"


@pytest.mark.parametrize(
    ("words", "place", "origin"),
    [
        (["--frame", "ecliptic/true/date"], "apparent", "earth"),
        (["--frame", "horizon", "--site", "Quern Hill"], "observed", "site"),
        (["--origin", "sun"], "geometric", "sun"),
        (["--origin", "ssb"], "geometric", "ssb"),
        (["--site", "Quern Hill"], "astrometric", "site"),
    ],
)
def test_where_defaults_follow_frame_and_origin(colure, words, place, origin):
    record = colure("where", "venus", "--at", "2026-12-01", "--format", "json", *words).records[0]
    assert (record["place"], record["origin"]) == (place, origin)


def test_where_steps_through_a_span_moments_outermost(colure):
    ran = colure(
        "where", "sun", "mars", "--at", "2026-12-01", "--until", "2026-12-03", "--step", "1 d", "--format", "json"
    )
    assert [(r["body"], r["utc"][:10]) for r in ran.records] == [
        (body, day) for day in ("2026-12-01", "2026-12-02", "2026-12-03") for body in ("sun", "mars")
    ]


def test_where_csv_reads_back_to_the_json_figures(colure):
    words = ("where", "all", "--at", "2026-12-01", "--until", "2026-12-02", "--step", "12 h", "--format")
    rows = list(csv.DictReader(line for line in io.StringIO(colure(*words, "csv").out) if not line.startswith("#")))
    records = colure(*words, "json").records
    assert len(rows) == len(records) == 30
    for row, record in zip(rows, records, strict=True):
        assert row["body"] == record["body"]
        assert float(row["lon_deg"]) == record["lon_deg"]


def test_where_says_the_caution_near_the_sun_and_only_there(colure):
    # Mercury is never further than 28° from the Sun (common practice); Uranus is at opposition in late November 2026.
    near = colure("where", "mercury", "--at", "2026-12-01")
    far = colure("where", "uranus", "--at", "2026-12-01")
    assert "CAUTION" in near.out
    assert "CAUTION" not in far.out


# convert


def test_convert_meets_erfa_for_mean_ecliptic_j2000(colure):
    ran = colure("convert", "10.5 -3.25", "--from", "icrs", "--to", "ecliptic/mean/J2000", "--format", "json")
    lon, lat = erfa.eqec06(2451545.0, 0.0, np.deg2rad(10.5), np.deg2rad(-3.25))
    record = ran.records[0]
    assert record["lon_deg"] == pytest.approx(math.degrees(lon), abs=1e-11)
    assert record["lat_deg"] == pytest.approx(math.degrees(lat), abs=1e-11)


def test_convert_takes_a_leading_minus_and_a_negative_year(colure):
    ran = colure(
        "convert", "-10.5 4", "--from", "ecliptic/mean/J2000", "--to", "equator/true/date", "--at", "-1200-03-30"
    )
    assert ran.code == 0
    assert "Julian calendar" in ran.out


def test_convert_table_there_and_back(colure, tmp_path: Path):
    source = tmp_path / "in.csv"
    source.write_text("name,ra,dec\na,10.5,-3\nb,211.25,64.5\n")
    there = tmp_path / "there.ecsv"
    assert colure("convert", "--table", str(source), "--from", "icrs", "--to", "galactic", "-o", str(there)).code == 0
    back = colure(
        "convert", "--table", str(there), "--from", "galactic", "--to", "icrs", "--lon", "lon_deg", "--lat", "lat_deg"
    )
    rows = list(csv.DictReader(line for line in io.StringIO(back.out) if not line.startswith("#")))
    assert [float(row["lon_deg"]) for row in rows] == pytest.approx([10.5, 211.25], abs=1e-11)
    assert [float(row["lat_deg"]) for row in rows] == pytest.approx([-3.0, 64.5], abs=1e-11)


def test_convert_table_refuses_bad_rows_by_number_and_takes_the_good_ones_on_request(colure, tmp_path: Path):
    source = tmp_path / "in.csv"
    source.write_text("ra,dec\n10,-3\n11,NaN\n200,91\n12,4\n")
    words = ("convert", "--table", str(source), "--from", "icrs", "--to", "galactic")
    refused = colure(*words)
    assert (refused.code, refused.out) == (2, "")
    assert "row 2" in refused.err
    assert "row 3" in refused.err
    taken = colure(*words, "--skip-bad")
    assert taken.code == 0, taken.err
    assert sum(not line.startswith("#") for line in taken.out.splitlines()) == 3
    assert "row 2" in taken.err
    assert "row 3" in taken.err


# time, obliquity


def test_time_gives_the_sidereal_time_of_a_published_example(colure):
    # Meeus, Astronomical Algorithms, 2nd ed., Ex. 12.a: mean sidereal time 13h10m46.3668s by the IAU 1982 expression;
    # that of 2006, which is used here, is 3.3 ms more in 1987 (erfa gmst06 − gmst82).
    record = colure("time", "1987-04-10 00:00 UT1", "--format", "json").records[0]
    assert record["gmst_deg"] == pytest.approx(15 * (13 + 10 / 60 + 46.3668 / 3600), abs=15 * 0.004 / 3600)


@pytest.mark.parametrize("text", ["-1200-03-30", "JD 2455200.5 TT", "J2000.0", "now"])
def test_time_takes_every_grammar(colure, text):
    assert colure("time", text).code == 0


def test_obliquity_takes_negative_years_and_all_models(colure):
    records = colure("obliquity", "-1200", "2000", "--model", "all", "--format", "json").records
    assert {record["year"] for record in records} == {-1200.0, 2000.0}
    at_2000 = {r["model"]: r["obliquity_deg"] * 3600 for r in records if r["year"] == 2000.0}
    assert at_2000["iau2006"] == pytest.approx(84381.406, abs=1e-9)  # Capitaine et al. 2003
    assert at_2000["iau1976"] == pytest.approx(84381.448, abs=1e-9)  # Lieske et al. 1977


# chart


@pytest.mark.parametrize(("suffix", "begins"), [("png", b"\x89PNG"), ("svg", b"<?xml"), ("pdf", b"%PDF")])
def test_chart_writes_each_format(colure, qapp, tmp_path: Path, suffix, begins):
    out = tmp_path / f"x.{suffix}"
    ran = colure(
        "chart", "-o", str(out), "--size", "640x480", "--at", "-1200-03-30", "--centre", "mars", "--width", "20"
    )
    assert ran.code == 0, ran.err
    assert out.read_bytes().startswith(begins)


def test_chart_options_reach_the_session(colure, qapp, tmp_path: Path):
    plain, other = tmp_path / "a.png", tmp_path / "b.png"
    size = ("--size", "640x480")
    assert colure("chart", "-o", str(plain), *size).code == 0
    words = (
        "--circle",
        "equator/mean/B1950;lat=10;colour=#123456",
        "--parity",
        "map",
        "--theme",
        "lamp",
        "--up",
        "zenith",
    )
    assert colure("chart", "-o", str(other), *size, *words).code == 0
    assert plain.read_bytes() != other.read_bytes()


# What goes wrong

BAD = [
    (["charrt"], 2, "did you mean 'chart'"),
    (["where", "marz"], 2, "did you mean 'mars'"),
    (["where", "mars", "--at", "2026-13-01"], 2, "month 13"),
    (["where", "mars", "--at", "1582-10-10"], 2, "does not exist"),
    (["where", "mars", "--at", "-5000-01-01"], 2, "year -5000"),
    (["where", "mars", "--at", "NaN"], 2, "NaN"),
    (["where", "mars", "--at", "3500-01-01"], 1, "covers"),
    (["where", "mars", "--frame", "ecliptc/mean/date"], 2, "did you mean 'ecliptic'"),
    (["where", "mars", "--frame", "ecliptic/mean/date@laskar1986"], 2, "obliquity only"),
    (["where", "mars", "--site", "Quern Hil"], 2, "Quern Hill"),
    (["where", "mars", "--until", "2026-12-03"], 2, "--step"),
    (["where", "mars", "--site", "Quern Hill", "--origin", "sun"], 2, "contradictory"),
    (["where", "mars", "--kernel", "/nonexistent.bsp"], 2, "nonexistent.bsp"),
    (["where", "mars", "--format", "xml"], 2, "votable"),
    (["where", "mars", "--modle", "x"], 2, "--modle"),
    (["where"], 2, "BODY"),
    (["convert", "12 30 45 -3 0 0", "--from", "icrs", "--to", "galactic"], 2, "hours or degrees"),
    (["convert", "1 95", "--from", "icrs", "--to", "galactic"], 2, "95"),
    (["convert", "nan 5", "--from", "icrs", "--to", "galactic"], 2, "nan"),
    (["convert", "1 2", "--from", "icrs", "--to", "equator/true/date"], 2, "--at"),
    (["convert", "1 2", "--from", "icrs", "--to", "horizon", "--at", "now"], 2, "--site"),
    (["convert", "1 2", "--from", "icrs", "--to", "galactic", "--epoch", "1975"], 2, "FK4"),
    (["convert", "1 2", "--table", "x.csv", "--from", "icrs", "--to", "galactic"], 2, "not both"),
    (["convert", "--table", "/nonexistent.csv", "--from", "icrs", "--to", "galactic"], 2, "nonexistent.csv"),
    (["convert", "--table", "/dev/null", "--from", "icrs", "--to", "galactic"], 2, "empty"),
    (["convert", "1 2", "--from", "icrs", "--to", "galactic", "-o", "/nonexistent/x.csv"], 2, "/nonexistent/x.csv"),
    (["time", "yesterday"], 2, "yesterday"),
    (["time", "2200-01-01 UTC"], 2, "UTC"),
    (["obliquity", "abc"], 2, "abc"),
    (["obliquity", "2000", "--model", "laskr1986"], 2, "laskar1986"),
    (["obliquity", "20000", "--model", "laskar1986"], 1, "outside its span"),
    (["obliquity", "300000"], 1, "300000"),
    (["chart", "-o", "x.gif"], 2, "expected .png"),
    (["chart", "-o", "/nonexistent/x.png", "--size", "640x480"], 2, "/nonexistent"),
    (["chart", "-o", "x.png", "--size", "big"], 2, "1600x1000"),
    (["chart", "-o", "x.png", "--circle", "galactic;lng=3"], 2, "lat=DEG"),
    (["chart", "-o", "x.png", "--centre", "Xyzzy Prime"], 2, "Xyzzy"),
    (["chart", "/nonexistent.toml", "-o", "x.png"], 2, "nonexistent.toml"),
    (["bench", "frame_ful_v8"], 2, "frame_full_v8"),
]


@pytest.mark.parametrize(("words", "code", "needle"), BAD, ids=[" ".join(words)[:60] for words, _, _ in BAD])
def test_bad_input_gets_one_clear_line(colure, qapp, monkeypatch, tmp_path, words, code, needle):
    monkeypatch.chdir(tmp_path)
    ran = colure(*words)
    assert ran.code == code, ran.err
    assert ran.out == ""
    assert needle in ran.err
    assert ran.err.startswith("colure: ")
    assert ran.err.count("\n") == 1
    assert "Traceback" not in ran.err
    assert "fault of colure itself" not in ran.err
    assert not list(tmp_path.iterdir()), "a refused command left a file"


def test_debug_shows_where(colure):
    ran = colure("--debug", "time", "yesterday")
    assert ran.code == 2
    assert "Traceback" in ran.err


def test_selfcheck_passes_on_the_shipped_data(colure):
    ran = colure("selfcheck", "--format", "json")
    faults = [record for record in ran.records if not record["ok"]]
    assert (ran.code, faults) == (0, [])
