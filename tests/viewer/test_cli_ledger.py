"""`colure ledger`: what it prints, in which form, with which exit code, and how it takes bad input."""

import csv
import io
import json
import subprocess
import sys
from pathlib import Path

import erfa
import numpy as np
import pytest

from colure import names


@pytest.fixture
def ledger(colure):
    return lambda *words: colure("ledger", *words)


def step(ran, name: str) -> dict:
    return next(record for record in ran.records if record["step"] == name)


AT = ("--at", "2026-12-01 21:36")
JSON = ("--format", "json")
BARNARD = ("269.452 4.6934", "--epoch", "J2000", "--pm", "-798.6", "10328.1", "--parallax", "548.3", "--rv", "-110.5")


def test_json_carries_the_keys_of_the_documentation(ledger):
    ran = ledger("mars", *AT, *JSON)
    assert ran.code == 0
    keys = {"step", "size_arcsec", "pa_deg", "model", "uncertainty_arcsec", "lon_deg", "lat_deg", "frame", "place"}
    for record in ran.records:
        assert keys | {"body", "utc", "tt_jd", "ut1_jd", "delta_t_s", "calendar", "origin"} <= set(record)
    assert [record["number"] for record in ran.records] == list(range(1, len(ran.records) + 1))
    assert ran.records[0]["size_arcsec"] is None


@pytest.mark.parametrize(
    ("words", "place", "origin"),
    [
        ([], "astrometric", "earth"),
        (["--frame", "ecliptic/true/date"], "apparent", "earth"),
        (["--frame", "horizon", "--site", "Quern Hill"], "observed", "site"),
        (["--origin", "sun"], "geometric", "sun"),
        (["--site", "Quern Hill"], "astrometric", "site"),
    ],
)
def test_defaults_follow_frame_and_origin(ledger, words, place, origin):
    record = ledger("venus", *AT, *JSON, *words).records[0]
    assert (record["place"], record["origin"]) == (place, origin)


def test_every_step_of_the_observed_place_in_its_order(ledger):
    ran = ledger("Aldebaran", *AT, *JSON, "--frame", "horizon", "--site", "Quern Hill")
    assert [record["step"] for record in ran.records] == [
        "catalogue position",
        "space motion",
        "annual parallax",
        "diurnal parallax",
        "light time",
        "deflection",
        "annual aberration",
        "diurnal aberration",
        "frame bias",
        "precession of the equator",
        "precession of the ecliptic",
        "nutation",
        "Earth rotation",
        "polar motion",
        "horizon of the site",
        "refraction",
    ]


@pytest.mark.parametrize("target", ["HIP 87937", "TYC", "Gaia"])
def test_a_star_by_any_of_its_numbers(ledger, target):
    known = names.identify(names.find("HIP 87937"))
    text = {"TYC": known.tycho, "Gaia": known.gaia}.get(target, target)
    assert text.startswith(target)
    records = ledger(text, *AT, *JSON).records
    assert records[0]["kind"] == "star"
    # Barnard's star moves 10.36″ a year; 10.92 years from J2016.0.
    assert records[1]["size_arcsec"] == pytest.approx(10.39 * 10.92, rel=5e-3)


def test_a_position_with_motion_meets_erfa(ledger):
    # ERFA's atci13 at the same TDB: its Earth is good to 1 mas here, which is what this allows; then its eo06a.
    ran = ledger(*BARNARD, *AT, *JSON, "--frame", "cirs", "--place", "apparent")
    last = ran.records[-1]
    dec = np.deg2rad(4.6934)
    ri, di, _ = erfa.atci13(
        np.deg2rad(269.452), dec, np.deg2rad(-0.7986 / 3600) / np.cos(dec), np.deg2rad(10.3281 / 3600), 0.5483, -110.5,
        last["tt_jd"], 0.0,
    )  # fmt: skip
    off = np.hypot((last["lon_deg"] - np.rad2deg(ri)) * np.cos(di), last["lat_deg"] - np.rad2deg(di)) * 3600.0
    assert off < 0.002
    assert (last["pm_lon_mas_yr"], last["epoch"]) == (-798.6, "J2000.0000")


def test_a_covariance_is_carried_to_the_end(ledger):
    words = ("10 20", *AT, "--pm", "0", "0", "--epoch", "J2016.0", "--covariance", "4 0 0 0 9 0 0 1 0 1")
    record = ledger(*words, *JSON).records[-1]
    years = (record["tt_jd"] - 2457388.5) / 365.25
    assert record["sigma_lon_arcsec"] == pytest.approx(1e-3 * np.sqrt(4.0 + years**2), rel=1e-3)
    assert record["sigma_lat_arcsec"] == pytest.approx(1e-3 * np.sqrt(9.0 + years**2), rel=1e-3)
    assert "covariance carried" in ledger(*words).out


def test_steps_can_be_left_out(ledger):
    words = ("mars", *AT, *JSON, "--frame", "equator/true/date")
    full, short = ledger(*words), ledger(*words, "--omit", "nutation", "--omit", "deflection")
    assert step(full, "nutation")["size_arcsec"] > 1.0
    assert (step(short, "nutation")["size_arcsec"], step(short, "nutation")["omitted"]) == (0.0, True)
    assert short.records[-1]["lon_deg"] != full.records[-1]["lon_deg"]


def test_matrices_on_request(ledger):
    ran = ledger("mars", *AT, *JSON, "--frame", "ecliptic/true/date", "--matrices")
    product = np.eye(3)
    for record in ran.records:
        if record["matrix"] is not None:
            product = np.array(record["matrix"]) @ product
    assert np.abs(product @ product.T - np.eye(3)).max() < 1e-13
    assert ledger("mars", *AT, "--frame", "ecliptic/true/date", "--matrices").out.count("components before it") == 5


def test_csv_reads_back_to_the_json_figures(ledger):
    words = ("moon", *AT, "--site", "Quern Hill", "--frame", "horizon")
    rows = list(csv.DictReader(line for line in io.StringIO(ledger(*words, "--format", "csv").out) if line[0] != "#"))
    for row, record in zip(rows, ledger(*words, *JSON).records, strict=True):
        assert row["step"] == record["step"]
        assert float(row["lon_deg"]) == record["lon_deg"]


def test_a_position_read_off_a_mount_is_led_back(ledger):
    words = (*AT, *JSON, "--seen", "apparent", "--from", "equator/true/date", "--frame", "equator/true/date")
    ran = ledger("120.5 -30.25", *words)
    assert "back from the apparent place" in [record["step"] for record in ran.records]
    assert ran.records[-1]["lon_deg"] == pytest.approx(120.5, abs=1e-10)
    assert ran.records[-1]["lat_deg"] == pytest.approx(-30.25, abs=1e-10)


def test_every_frame_with_differences_and_a_carried_angle(ledger):
    words = ("mars", *AT, "--every-frame", "--site", "Quern Hill")
    ran = ledger(*words, *JSON, "--against", "ecliptic/mean/J2000", "--pa", "-10")
    rows = {record["frame"]: record for record in ran.records}
    # 50.29″ a year of precession over 26.9 years.
    assert rows["ecliptic/mean/date"]["dlon_arcsec"] == pytest.approx(50.29 * 26.92, abs=2.0)
    assert rows["ecliptic/mean/J2000"]["pa_deg"] == pytest.approx(350.0)
    assert rows["horizon"]["along_arcsec"] is not None
    text = ledger(*words).out
    assert "Δλ cos β" in text
    assert "along" in text
    without = ledger("12 30", *AT, "--every-frame")
    assert "needs a site" in without.out
    assert "along" not in without.out


def test_output_goes_to_a_file(ledger, tmp_path: Path):
    out = tmp_path / "x.json"
    assert ledger("mars", *AT, *JSON, "-o", str(out)).code == 0
    assert json.loads(out.read_text())[0]["body"] == "mars"


def test_it_imports_no_qt():
    code = (
        "import sys; from colure_viewer.cli.main import main; main(['ledger', 'HIP 21421', '--at', '2026-12-01']);"
        "bad = [m for m in ('PySide6', 'shiboken6', 'pyqtgraph', 'astropy') if m in sys.modules]; sys.exit(bool(bad))"
    )
    assert subprocess.run([sys.executable, "-c", code], capture_output=True).returncode == 0


BAD = [
    (["marz"], 2, "did you mean"),
    ([], 2, "TARGET"),
    (["mars", "--at", "2026-13-01"], 2, "month 13"),
    (["mars", "--at", "3500-01-01"], 1, "covers"),
    (["mars", "--frame", "ecliptc/mean/date"], 2, "did you mean 'ecliptic'"),
    (["mars", "--frame", "horizon"], 2, "site"),
    (["mars", "--site", "Quern Hil"], 2, "Quern Hill"),
    (["mars", "--site", "Quern Hill", "--origin", "sun"], 2, "contradictory"),
    (["mars", "--origin", "site"], 2, "--site"),
    (["mars", "--place", "observed"], 2, "site"),
    (["earth"], 2, "no direction"),
    (["mars", "--pm", "1", "2"], 2, "has its own"),
    (["HIP 21421", "--epoch", "J2000"], 2, "has its own"),
    (["mars", "--omit", "nutatoin"], 2, "did you mean 'nutation'"),
    (["10 nan"], 2, "nan"),
    (["10 95"], 2, "95"),
    (["12 30 45 -3 0 0"], 2, "hours or degrees"),
    (["10 20", "--pm", "1", "nan"], 2, "nan"),
    (["10 20", "--pm", "1"], 2, "2 arguments"),
    (["10 20", "--pm", "1e9", "0"], 2, "proper motion"),
    (["10 20", "--parallax", "-5"], 2, "parallax"),
    (["10 20", "--rv", "fast"], 2, "fast"),
    (["10 20", "--epoch", "whenever"], 2, "whenever"),
    (["10 20", "--epoch", "nan"], 2, "nan"),
    (["10 20", "--covariance", "1 2"], 2, "3, 10, 15 or 21"),
    (["10 20", "--covariance", "1 x 2"], 2, "'x'"),
    (["10 20", "--covariance", "1 2 1"], 2, "contradict"),
    (["10 20", "--covariance", "nan 0 1"], 2, "not finite"),
    (["10 20", "--seen", "apparent", "--pm", "1", "2"], 2, "no motion"),
    (["10 20", "--seen", "observed"], 2, "site"),
    (["10 20", "--against", "icrs"], 2, "--every-frame"),
    (["10 20", "--every-frame", "--pa", "north"], 2, "north"),
    (["10 20", "--every-frame", "--against", "horizon"], 2, "site"),
    (["ecliptic/mean/date 0 90", "--every-frame", "--against", "ecliptic/mean/date", "--pa", "5"], 2, "its pole"),
    (["mars", "--kernel", "/nonexistent.bsp"], 2, "nonexistent.bsp"),
    (["mars", "--format", "xml"], 2, "votable"),
    (["mars", "-o", "/nonexistent/x.csv"], 2, "/nonexistent/x.csv"),
]


@pytest.mark.parametrize(("words", "code", "needle"), BAD, ids=[" ".join(words)[:60] for words, _, _ in BAD])
def test_bad_input_gets_one_clear_line(ledger, monkeypatch, tmp_path, words, code, needle):
    monkeypatch.chdir(tmp_path)
    ran = ledger(*words)
    assert ran.code == code, ran.err
    assert ran.out == ""
    assert needle in ran.err
    assert ran.err.startswith("colure: ")
    assert ran.err.count("\n") == 1
    assert "fault of colure itself" not in ran.err
    assert not list(tmp_path.iterdir()), "a refused command left a file"
