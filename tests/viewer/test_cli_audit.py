"""`colure audit`: what it prints, the commands that mend, exit codes, and bad input in one line."""

import csv
import io
import re
import shlex
from pathlib import Path

import audit_truth as truth
import erfa
import numpy as np
import pytest

from colure import audit
from colure.arrays import ARCSEC, DEG, cartesian, separation
from colure.audit import Numbers, Question, Stars
from colure.moment import Moment
from colure.stars import catalogue

# Verdicts


def test_a_certain_verdict_in_words(colure) -> None:
    ran = colure("audit", "4.5987 16.5093", "--against", "Aldebaran", "--claim", "icrs")
    assert ran.code == 0
    lines = ran.out.splitlines()
    assert "± 0.18″ × 0.18″" in lines[0]
    assert lines[1].startswith("certain: ICRS, astrometric; right ascension in hours, read as degrees [A1+B1]")
    assert any(line.startswith("·") and "A1+B1" in line for line in lines)


def test_records_carry_the_verdict_the_class_and_the_mending(colure) -> None:
    ran = colure(
        *("audit", "17h46m45.64s -23°57.1′", "--against", "mars", "--at", "2024-01-01T00:00:00 UTC"),
        *("--claim", "equator/true/date", "--rounding", "6", "--format", "json"),
    )
    assert ran.code == 0
    first = ran.records[0]
    assert first["status"] == "class"
    assert [record["code"] for record in ran.records if record["in_class"]] == ["B2+B6", "B6"]
    assert first["tt_jd"] == pytest.approx(2460310.5 + 69.184 / 86400.0, abs=1e-8)
    mends = [record["mend"] for record in ran.records if record["mend"]]
    assert len(mends) == 1
    assert mends[0].startswith('colure convert "266.6901667 -23.9516667" --from icrs --to equator/true/date --at')


@pytest.mark.parametrize("form", ["csv", "ecsv", "votable"])
def test_every_form_of_output_is_written(colure, form: str, tmp_path: Path) -> None:
    path = tmp_path / f"out.{form}"
    assert colure("audit", "68.98 16.5", "--against", "Aldebaran", "--format", form, "-o", str(path)).code == 0
    assert path.read_bytes()
    if form == "csv":
        rows = list(csv.DictReader(io.StringIO(path.read_text())))
        assert {"status", "rank", "code", "n_sigma", "residual_arcsec", "in_class", "frame"} <= set(rows[0])


def test_none_of_these_is_exit_code_1(colure) -> None:
    ran = colure("audit", "200.12345 -70.12345", "--against", "Aldebaran", "--claim", "icrs")
    assert ran.code == 1
    assert "none of these" in ran.out


def test_a_leading_minus_is_a_number(colure) -> None:
    ran = colure("audit", "-0.5 -16.5", "--against", "icrs 359.5 -16.5")
    assert ran.code == 0
    assert "ICRS, astrometric" in ran.out


def test_a_position_angle(colure) -> None:
    ran = colure(
        *("audit", "--pa", "69.64", "--true", "69.67", "--against", "349.0547 5.3883"),
        *("--at", "JD 2460324.0607 UTC", "--format", "json"),
    )
    assert ran.code == 0
    assert ran.records[0]["code"] == "F5"
    assert ran.records[0]["status"] == "certain"


def test_an_offset_with_the_cosine_twice(colure) -> None:
    ran = colure("audit", "--offset", "50.00 10.00", "--true", "100.00 10.00", "--against", "10 60", "--format", "json")
    assert ran.code == 0
    assert ran.records[0]["code"] == "A11"


def test_the_mending_line_gives_the_true_position(colure) -> None:
    at = Moment.parse("2026-06-01T12:00:00 UTC")
    true = cartesian(120.0 * DEG, -20.0 * DEG)
    precession = erfa.bp06(*at.tt)[2]
    cases = {
        "equator/fk4/B1950": erfa.fk54z(*erfa.hfk5z(*erfa.c2s(true), 2451545.0, 0.0)[:2], 1950.0)[:2],
        "equator/mean/date": erfa.c2s(precession @ true),
        "twice": erfa.c2s(precession @ precession @ true),
        "backwards": erfa.c2s(precession.T @ true),
        "galactic": erfa.icrs2g(*erfa.c2s(true)),
        "j2000-obliquity-of-date": erfa.c2s(erfa.rx(erfa.obl06(*at.tt), np.eye(3)) @ true),
        "wrong-way-date": erfa.c2s(erfa.rx(-erfa.obl06(*at.tt), np.eye(3)) @ precession @ true),
    }
    for key, (lon, lat) in cases.items():
        numbers = Numbers.of(np.degrees(lon) % 360.0, np.degrees(lat), 1e-6, 1e-6)
        answer = audit.ask(numbers, Question(Stars.point(120.0, -20.0), at, claim="icrs"))
        assert answer.simplest.hypothesis.axes.key == key
        assert answer.mending.commands
        for line in answer.mending.commands:
            words = shlex.split(line)
            assert words[0] == "colure"
            ran = colure(*words[1:], "--format", "json")
            assert ran.code == 0, ran.err
            record = ran.records[0]
        mended = cartesian(record["lon_deg"] * DEG, record["lat_deg"] * DEG)
        assert float(separation(mended, true)) / ARCSEC < 0.01, key  # 1e-6° of rounding, and what FK5 adds


# Tables


def test_a_table_of_stars_is_dated(colure, tmp_path: Path) -> None:
    rng = np.random.default_rng(8)
    bright = catalogue().brighter(6.0)
    rows = bright.take(rng.choice(len(bright), 200, replace=False))
    rows = rows.take(rows.hip > 0)
    lon, lat = erfa.c2s(rows.directions(1900.0) @ erfa.ltpb(1900.0).T)
    path = tmp_path / "old.csv"
    lines = [f"{h},{a:.4f},{d:.4f}" for h, a, d in zip(rows.hip, np.degrees(lon) % 360.0, np.degrees(lat), strict=True)]
    path.write_text("hip,ra,dec\n" + "\n".join(lines) + "\n")
    ran = colure("audit", "--table", str(path))
    assert ran.code == 0
    assert re.search(r"equinox J1(900\.0|899\.99)\d* ± 0\.00\d* \(mean equator and equinox\)", ran.out)
    assert f"mend: colure convert --table {path} --from equator/mean/J1900.00 --to icrs" in ran.out
    record = colure("audit", "--table", str(path), "--format", "json").records[0]
    assert record["equinox"] == pytest.approx(1900.0, abs=0.02)
    assert record["epoch"] == pytest.approx(1900.0, abs=5 * record["epoch_sigma"])


def test_a_table_of_a_body_is_explained_as_a_whole(colure, tmp_path: Path) -> None:
    path = tmp_path / "jupiter.csv"
    words = ("--at", "2026-01-01", "--until", "2026-03-01", "--step", "5 d", "--frame", "ecliptic/true/date")
    assert colure("where", "jupiter", *words, "--format", "csv", "-o", str(path)).code == 0
    ran = colure("audit", "--table", str(path), "--against", "jupiter", "--claim", "ecliptic/mean/J2000")
    assert ran.code == 0
    assert "certain: mean ecliptic and true equinox of date, apparent [C4]" in ran.out
    assert "12 rows together" in ran.out


def test_stars_of_a_table_at_a_moment_are_explained_with_their_aberration(colure, tmp_path: Path) -> None:
    bright = catalogue().brighter(5.0)
    rows = bright.take(np.flatnonzero(bright.hip > 0)[::8])
    moment = Moment.parse("2026-06-01T00:00:00 UTC")
    when = truth.When.of(moment.shifted(np.zeros(len(rows))))
    lon, lat = truth.axes("equator/true/date", truth.star(rows, when, "apparent"), when)
    path = tmp_path / "apparent.csv"
    lines = [f"{h},{a:.5f},{d:.5f}" for h, a, d in zip(rows.hip, np.degrees(lon), np.degrees(lat), strict=True)]
    path.write_text("hip,ra,dec\n" + "\n".join(lines) + "\n")
    ran = colure("audit", "--table", str(path), "--at", "2026-06-01T00:00:00 UTC", "--claim", "icrs")
    assert ran.code == 0
    assert "true equator and equinox of date, apparent [B5]" in ran.out
    assert (
        f"mend: colure convert --table {path} --from equator/true/date --to icrs --at '2026-06-01T00:00:00 UTC'"
        in ran.out
    )


def test_the_residual_is_given_on_equator_ecliptic_and_along_the_motion(colure) -> None:
    words = ("audit", "17h46m45.64s -23°57.1′", "--against", "mars", "--at", "2024-01-01T00:00:00 UTC")
    ran = colure(*words, "--claim", "equator/true/date", "--rounding", "6", "--format", "json")
    first = ran.records[0]
    # Precession in 24 years: 24.0 × 50.29″ in longitude, times cos β (−0.5°), less 18″ of aberration.
    assert first["off_lon_arcsec"] == pytest.approx(-24.0 * 50.29, abs=20.0)
    assert abs(first["off_lat_arcsec"]) < 12.5  # what the ecliptic turned
    assert np.hypot(first["off_ra_arcsec"], first["off_dec_arcsec"]) == pytest.approx(
        np.hypot(first["off_lon_arcsec"], first["off_lat_arcsec"]), rel=1e-9
    )
    assert np.hypot(first["off_along_arcsec"], first["off_across_arcsec"]) == pytest.approx(
        np.hypot(first["off_ra_arcsec"], first["off_dec_arcsec"]), rel=1e-4
    )


# Bad input


@pytest.mark.parametrize(
    ("words", "reason"),
    [
        ((), "nothing given"),
        (("1 2", "--pa", "3"), "position and pa given"),
        (("1 2", "--against", "mras"), "in no list"),
        (("1 2", "--against", "mars"), "a moment is needed"),
        (("1 2", "--against", "Aldebaran", "--claim", "b1950"), "unknown plane"),
        (("1 2", "--against", "Aldebaran", "--claim", "equator/true/date"), "a moment is needed"),
        (("1 2", "--against", "Aldebaran", "--at", "2026-13-01"), "month"),
        (("1 2", "--against", "Aldebaran", "--site", "Nowhere At All"), "unknown"),
        (("1 2", "--against", "Aldebaran", "--origin", "site"), "no --site"),
        (("1 2", "--against", "Aldebaran", "--rounding", "-1"), "rounding"),
        (("1 2", "--against", "Aldebaran", "--rounding", "nan"), "rounding"),
        (("1 2", "--against", "mars", "--at", "2026-01-01", "--exposure", "-1"), "exposure"),
        (("1 2", "--against", "mars", "--at", "4000-01-01"), "outside its span|span"),
        (("1 2", "--true", "3"), "--true"),
        (("12 34 56 -10 20 30", "--against", "Aldebaran"), "hours or degrees"),
        (("75 12",), "by chance"),
        (("--pa", "12",), "--against"),
        (("--pa", "twelve", "--true", "1", "--against", "1 2"), "no number|no part"),
        (("--offset", "1", "--true", "1 2", "--against", "1 2"), "two numbers"),
        (("--offset", "1 x", "--true", "1 2", "--against", "1 2"), "two numbers"),
        (("--table", "/nowhere/at/all.csv"), "cannot be read"),
    ],
)  # fmt: skip
def test_bad_input_is_one_line(colure, words: tuple[str, ...], reason: str) -> None:
    ran = colure("audit", *words)
    assert ran.code in (1, 2)
    assert ran.out == ""
    assert len(ran.err.strip().splitlines()) == 1
    assert re.search(reason, ran.err), ran.err


def test_tables_that_hold_no_stars_are_refused(colure, tmp_path: Path) -> None:
    path = tmp_path / "few.csv"
    path.write_text("ra,dec\n10.5,20.5\n11.5,21.5\n")
    ran = colure("audit", "--table", str(path))
    assert ran.code == 2
    assert "2 rows; expected 5 or more" in ran.err
    rng = np.random.default_rng(1)
    path.write_text("ra,dec\n" + "\n".join(f"{a:.4f},{d:.4f}" for a, d in rng.uniform(0, 80, (50, 2))) + "\n")
    ran = colure("audit", "--table", str(path))
    assert ran.code == 2
    assert "meet a star" in ran.err
    path.write_text("ra,dec\n" + "\n".join("nan,10" for _ in range(9)) + "\n")
    assert colure("audit", "--table", str(path)).code == 2
