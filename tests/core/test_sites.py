"""Sites: names, codes, typed coordinates, the user's file, and what is refused."""

import math
from pathlib import Path

import erfa
import pytest
from hypothesis import given
from hypothesis import strategies as st

from colure import sites
from colure.errors import SiteError
from colure.sites import DEMO, Site


@pytest.fixture(autouse=True)
def _no_file_of_mine(monkeypatch: pytest.MonkeyPatch, tmp_path_factory: pytest.TempPathFactory) -> None:
    monkeypatch.delenv("COLURE_SITES", raising=False)
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path_factory.mktemp("config")))


def test_the_demo_site_is_marked_as_invented() -> None:
    assert Site.parse("quern hill") is DEMO
    assert str(DEMO) == "Quern Hill, 129.40° E 25.90° S 710 m"
    assert "invented" in DEMO.note


@pytest.mark.parametrize(
    ("text", "lon", "lat", "height"),
    [
        ("129.40 -25.90 710", 129.4, -25.9, 710.0),
        ("129.40° E 25.90° S 710 m", 129.4, -25.9, 710.0),
        ("25.9 S 129.4 E 710", 129.4, -25.9, 710.0),
        ("129°24′00″ E 25°54′00″ S 710 m", 129.4, -25.9, 710.0),
        ("-70.5 -30.25 2200.5", -70.5, -30.25, 2200.5),
        ("289.5, -30.25, 2200", -70.5, -30.25, 2200.0),
        ("0 51 −20", 0.0, 51.0, -20.0),
    ],
)
def test_coordinates_are_read_and_read_back(text: str, lon: float, lat: float, height: float) -> None:
    site = Site.parse(text)
    assert (site.lon_deg, site.lat_deg, site.height_m) == pytest.approx((lon, lat, height), abs=1e-9)
    again = Site.parse(site.coordinates())
    assert (again.lon_deg, again.lat_deg, again.height_m) == pytest.approx((lon, lat, height), abs=1e-6)


@given(st.floats(-180, 180), st.floats(-90, 90), st.floats(-500, 9999))
def test_any_place_reads_back(lon: float, lat: float, height: float) -> None:
    again = Site.parse(Site("here", lon, lat, height).coordinates())
    assert math.remainder(again.lon_deg - lon, 360.0) == pytest.approx(0.0, abs=6e-7)
    assert again.lat_deg == pytest.approx(lat, abs=6e-7)
    assert again.height_m == pytest.approx(height, abs=0.06)


def test_codes_meet_their_parallax_constants() -> None:
    """ρ cos φ′ = 0.864981, ρ sin φ′ = −0.500958, 289.25058° E of code X05 (Minor Planet Center), to 6 decimals."""
    site = Site.parse("X05")
    assert site.code == "X05"
    assert site == Site.parse("simonyi survey telescope, rubin observatory")
    assert site.lon_deg == pytest.approx(289.25058 - 360.0, abs=1e-9)
    x, _, z = erfa.gd2gc(1, 0.0, math.radians(site.lat_deg), site.height_m) / 6378137.0
    assert (x, z) == pytest.approx((0.864981, -0.500958), abs=6e-7)
    # The observatory states 2647 m above the sea, where the geoid is 36 m above the ellipsoid (from memory).
    assert site.height_m == pytest.approx(2683, abs=10)


def test_codes_without_a_height_or_a_place_say_so() -> None:
    coarse = Site.parse("003")
    assert coarse.height_m == 0.0
    assert "height unknown" in coarse.note
    assert "good to 3189 m" in coarse.note
    for code, reason in (
        ("500", "the Earth's centre"),
        ("244", "the Earth's centre"),
        ("250", "without a fixed place"),
    ):
        with pytest.raises(SiteError, match=reason):
            Site.parse(code)
    assert len(sites.observatories()) == 2700
    for code, _ in sites.observatories():
        assert Site.parse(code).code == code


@pytest.mark.parametrize(
    ("text", "reason"),
    [
        ("", "nothing was given"),
        ("Qern Hill", "did you mean 'Quern Hill'"),
        ("Rubin", "X05 Simonyi"),
        ("129.4 -25.9", "LON LAT HEIGHT"),
        ("129.4 -95 10", "−90° to 90°"),
        ("129 E 25 W 10", "one of E and W"),
        ("-129 E 25 N 10", "both a sign and a letter"),
        ("1 2 99999", "-500 to 10000"),
        ("nan nan nan", "unknown"),
    ],
)
def test_bad_sites_say_why(text: str, reason: str) -> None:
    with pytest.raises(SiteError, match=reason):
        Site.parse(text)


@given(st.text(max_size=40))
def test_any_text_is_a_site_or_refused_in_one_line(text: str) -> None:
    try:
        Site.parse(text)
    except SiteError as error:
        lines = str(error).splitlines()
    else:
        lines = ["read"]
    assert len(lines) == 1


def test_the_users_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    file = tmp_path / "sites.toml"
    file.write_text(
        '[[site]]\nname = "Back field"\nlongitude_deg = 10.5\nlatitude_deg = 50\nheight_m = 120\n'
        "pressure_hpa = 1000.0\nhorizon = [[0, 5], [180.0, 12.5]]\n",
        encoding="utf-8",
    )
    site = Site.parse("back field", path=file)
    assert site.pressure_hpa == 1000.0
    assert site.temperature_c is None
    assert site.horizon == ((0.0, 5.0), (180.0, 12.5))
    monkeypatch.setenv("COLURE_SITES", str(file))
    assert sites.user_sites() == (site,)
    assert sites.search("back")[0] == "Back field"
    monkeypatch.setenv("COLURE_SITES", str(tmp_path / "none.toml"))
    with pytest.raises(SiteError, match=r"none\.toml"):
        sites.user_sites()


@pytest.mark.parametrize(
    ("text", "reason"),
    [
        ("[[site]\n", "file of sites"),
        ("site = 3\n", r"tables \[\[site\]\]"),
        ('[[site]]\nname = "a"\n', "no 'longitude_deg'"),
        ('[[site]]\nname = "a"\nlongitude_deg = 1\nlatitude_deg = 2\nheight_m = 3\ncolor = 1\n', "unknown key 'color'"),
        ('[[site]]\nname = "a"\nlongitude_deg = nan\nlatitude_deg = 2\nheight_m = 3\n', "longitude nan"),
        ('[[site]]\nname = "a"\nlongitude_deg = "1"\nlatitude_deg = 2\nheight_m = 3\n', "longitude '1'"),
        (
            '[[site]]\nname = "a"\nlongitude_deg = 1\nlatitude_deg = 2\nheight_m = 3\nhorizon = [[9, 1], [2, 1]]\n',
            "horizon",
        ),
        ('[[site]]\nname = ""\nlongitude_deg = 1\nlatitude_deg = 2\nheight_m = 3\n', "expected text"),
        ("#" * 1_000_001, "at most 1000000"),
    ],
)
def test_bad_files_of_sites_say_where(text: str, reason: str, tmp_path: Path) -> None:
    file = tmp_path / "sites.toml"
    file.write_text(text, encoding="utf-8")
    with pytest.raises(SiteError, match=reason):
        sites.user_sites(file)
