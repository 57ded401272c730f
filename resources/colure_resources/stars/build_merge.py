"""The merge of Tycho-2, Hipparcos-2 and Gaia DR3 into one list of stars, each once; used by build_stars.py."""

from types import SimpleNamespace

import numpy as np
from build_sources import lonlat, move, propagate, triad, vectors
from scipy.spatial import cKDTree

from colure import starfiles

ARCSEC = np.pi / 648000.0
EPOCH = 2016.0


def v_of_gaia(g, colour):
    """V from G and BP−RP; the colour of a middling star where there is none. Scatter 0.022 mag."""
    x = np.clip(np.where(np.isnan(colour), 0.8, colour), -0.5, 5)
    return g + 0.02704 - 0.01424 * x + 0.2156 * x**2 - 0.01426 * x**3


def v_of_tycho(bt, vt):
    """V from BT and VT (ESA SP-1200, section 1.3); from one of them with a middling colour where one is missing."""
    return np.where(np.isnan(vt), bt - 0.65, vt - 0.090 * np.where(np.isnan(bt), 0.6, bt - vt))


def v_of_hipparcos(hp, bv):
    """V from Hp and B−V, fitted to catalogued V magnitudes, scatter 0.016 mag."""
    poly = [-0.0716, 0.3429, -0.5193, 0.4016, -0.3118, -0.0040]
    return hp + np.polyval(poly, np.clip(np.where(np.isnan(bv), 0.6, bv), -0.3, 1.9))


def bv_of_gaia(colour):
    return np.polyval([0.0049, -0.1833, 0.5084, 0.5120, -0.0064], np.clip(colour, -0.4, 3))


def chord(arcsec):
    return 2 * np.sin(arcsec * ARCSEC / 2)


def pairs_within(a, b, arcsec):
    """Index pairs of points of a and b nearer than a limit, and their separations in arcseconds."""
    found = cKDTree(a).sparse_distance_matrix(cKDTree(b), chord(arcsec), output_type="ndarray")
    return found["i"].astype(np.int64), found["j"].astype(np.int64), found["v"] / ARCSEC


def greedy(i, j, cost, size_a, size_b):
    """Pair each member at most once, the cheapest pairs first."""
    free_a, free_b = np.ones(size_a, bool), np.ones(size_b, bool)
    chosen = []
    for k in np.argsort(cost, kind="stable"):
        if free_a[i[k]] and free_b[j[k]]:
            free_a[i[k]] = free_b[j[k]] = False
            chosen.append(k)
    chosen = np.array(chosen, dtype=np.int64)
    return i[chosen], j[chosen], chosen


def place_tycho(t, h):
    """Tycho stars at J2016.0: unit vectors, the motion used (NaN none known) and their observed vectors."""
    observed = vectors(t.obs_lon, t.obs_lat)
    pm_lon, pm_lat = t.pm_lon.copy(), t.pm_lat.copy()
    known = ~np.isnan(pm_lon)
    h_row = np.full(max(t.hip.max(), h.hip.max()) + 1, -1)
    h_row[h.hip] = np.arange(len(h.hip))
    same = h_row[t.hip]
    use = ~known & (t.hip > 0) & (same >= 0)
    pm_lon[use], pm_lat[use] = h.pm_lon[same[use]], h.pm_lat[same[use]]
    print(f"  Tycho stars without motion of their own: {(~known).sum()}; given that of their HIP number: {use.sum()}")
    for tree, source, reach in (
        (cKDTree(vectors(h.lon, h.lat)), h, 15.0),
        (cKDTree(observed[known]), SimpleNamespace(pm_lon=t.pm_lon[known], pm_lat=t.pm_lat[known]), 5.0),
    ):
        lost = np.flatnonzero(np.isnan(pm_lon))
        distance, nearest = tree.query(observed[lost], distance_upper_bound=chord(reach))
        near = np.isfinite(distance)
        pm_lon[lost[near]], pm_lat[lost[near]] = source.pm_lon[nearest[near]], source.pm_lat[nearest[near]]
        print(f"  given that of a neighbour within {reach:.0f}″: {near.sum()}")
    from_mean = t.pflag == b" "
    lon, lat = np.where(from_mean, t.lon, t.obs_lon), np.where(from_mean, t.lat, t.obs_lat)
    east, north = np.nan_to_num(pm_lon), np.nan_to_num(pm_lat)
    # The two coordinates have epochs of their own; the motion is small enough to be taken one by one.
    years_lon = EPOCH - np.where(from_mean, 2000.0, t.epoch_lon)
    years_lat = EPOCH - np.where(from_mean, 2000.0, t.epoch_lat)
    v = move(lon, lat, east * years_lon, north * years_lat, 1.0)
    return v, pm_lon, pm_lat, observed


def share_light(out, h, has_h, gaia_v):
    """Take the light of a companion that has a row of its own off a Hipparcos magnitude that includes it."""
    several = np.flatnonzero(has_h & (np.where(has_h, h.nc[out.ih], 0) > 1))
    others = np.flatnonzero(~has_h)
    i, j, _ = pairs_within(out.v[several], out.v[others], 10.0)
    light = np.zeros(len(several))
    np.add.at(light, i, 10 ** (-0.4 * out.vmag[others[j]]))
    total = 10 ** (-0.4 * out.vmag[several])
    rest = total - light
    alone = -2.5 * np.log10(np.where(rest > 0.2 * total, rest, total))
    own = gaia_v[several]
    change = (light > 0) & (np.isnan(own) | (np.abs(alone - own) < np.abs(out.vmag[several] - own)))
    print(
        f"Hipparcos magnitudes of two stars together, parted: {change.sum()}, of them V < 6.5: "
        f"{(change & (out.vmag[several] < 6.5)).sum()}"
    )
    out.vmag[several[change]] = alone[change]


def merge(h, g, t, extra, rv):
    """One row per star: columns in a namespace (v vectors at J2016.0, motions, V, B−V, flags, identifiers)."""
    nh, ng = len(h.hip), len(g.id)
    v_h, h_pm_lon, h_pm_lat, h_parallax, h_rv = propagate(h, rv, EPOCH - 1991.25)
    v_g = vectors(g.lon, g.lat)
    h_bv = np.where((h.bv == 0) & (h.bv_error == 0), np.nan, h.bv)
    mag_h, mag_g, mag_t = v_of_hipparcos(h.hp, h_bv), v_of_gaia(g.g, g.colour), v_of_tycho(t.bt, t.vt)

    i, j, sep = pairs_within(v_h, v_g, 3.0)
    dv = np.abs(mag_h[i] - mag_g[j])
    # Within 0.3″ after 25 years of motion it is the same star, however different the magnitude (Mira stars).
    allowed = np.where(sep < 0.3, 9.9, np.where((h.nc[i] > 1) | (h.sn[i] != 5), 1.6, 1.0))
    keep = dv < allowed
    i, j, sep, dv = i[keep], j[keep], sep[keep], dv[keep]
    ih, jg, k = greedy(i, j, sep + dv, nh, ng)
    print(f"Hipparcos–Gaia: {len(ih)} matched, median separation {np.median(sep[k]) * 1000:.1f} mas")
    gaia_of_h = np.full(nh, -1)
    gaia_of_h[ih] = jg

    print("Tycho-2 to J2016.0:")
    v_t, t_pm_lon, t_pm_lat, _v_obs = place_tycho(t, h)
    h_row = np.full(max(t.hip.max(), h.hip.max()) + 1, -1)
    h_row[h.hip] = np.arange(nh)
    same = np.where(t.hip > 0, h_row[t.hip], -1)
    claim = np.flatnonzero(same >= 0)
    claim = claim[np.lexsort((mag_t[claim], same[claim]))]
    first = np.r_[True, np.diff(same[claim]) > 0]
    tycho_of_h = np.full(nh, -1)
    tycho_of_h[same[claim[first]]] = claim[first]
    print(f"Tycho–Hipparcos by number: {first.sum()} stars, {(~first).sum()} further components set free")

    free_t = np.ones(len(t.hip), bool)
    free_t[claim[first]] = False
    free_g = np.ones(ng, bool)
    free_g[jg] = False
    ft, fg = np.flatnonzero(free_t), np.flatnonzero(free_g)
    i, j, sep = pairs_within(v_g[fg], v_t[ft], 2.0)
    dv = np.abs(mag_g[fg[i]] - mag_t[ft[j]])
    keep = dv < np.where(sep > 1.0, 0.7, 1.5)
    i, j, sep, dv = i[keep], j[keep], sep[keep], dv[keep]
    ig, jt, k = greedy(i, j, sep + dv, len(fg), len(ft))
    ig, jt = fg[ig], ft[jt]
    print(f"Gaia–Tycho: {len(ig)} matched, median separation {np.median(sep[k]) * 1000:.1f} mas")
    tycho_of_g = np.full(ng, -1)
    tycho_of_g[ig] = jt
    free_t[jt] = False

    # Companions turn about their star in 25 years, which their catalogued motion does not say: a second, wider pass.
    lone, ft = np.flatnonzero(free_g & (tycho_of_g < 0)), np.flatnonzero(free_t)
    i, j, sep = pairs_within(v_g[lone], v_t[ft], 5.0)
    dv = np.abs(mag_g[lone[i]] - mag_t[ft[j]])
    keep = dv < 0.7
    ig, jt, _ = greedy(i[keep], j[keep], (sep + dv)[keep], len(lone), len(ft))
    turning = lone[ig]
    tycho_of_g[turning] = ft[jt]
    free_t[ft[jt]] = False
    print(f"Gaia–Tycho companions 2″ to 5″ apart: {len(ig)} matched")

    # Which source gives each row: Hipparcos stars, then free Gaia stars, then free Tycho stars that are no blends.
    used = np.concatenate([np.where((gaia_of_h >= 0)[:, None], v_g[gaia_of_h], v_h), v_g[fg]])
    ft = np.flatnonzero(free_t)
    distance, _ = cKDTree(used).query(v_t[ft], distance_upper_bound=chord(1.5))
    blend = np.isfinite(distance)
    ft = ft[~blend]
    print(
        f"Tycho blends dropped: {blend.sum()}; Tycho stars alone: {len(ft)}; "
        f"Gaia stars alone: {(tycho_of_g[fg] < 0).sum()}"
    )

    _none_h, none_g, none_t = np.full(nh, -1), np.full(len(fg), -1), np.full(len(ft), -1)
    ih_all = np.concatenate([np.arange(nh), none_g, none_t])
    ig_all = np.concatenate([gaia_of_h, fg, none_t])
    it_all = np.concatenate([tycho_of_h, tycho_of_g[fg], ft])
    n = len(ih_all)
    has_h, has_g, has_t = ih_all >= 0, ig_all >= 0, it_all >= 0
    out = SimpleNamespace(n=n, ih=ih_all, ig=ig_all, it=it_all)
    out.v = np.concatenate([used, v_t[ft]])

    # Motion.
    pm_lon, pm_lat = np.full(n, np.nan), np.full(n, np.nan)
    pm_lon[has_h], pm_lat[has_h] = h_pm_lon[ih_all[has_h]], h_pm_lat[ih_all[has_h]]
    # A single star seen at both ends of 25 years: the small offset at the second corrects the three-year motion.
    _, east, north = triad(*lonlat(v_h))
    gap = np.where((gaia_of_h >= 0)[:, None], v_g[gaia_of_h] - v_h, 0.0) / ARCSEC * 1000
    single = (gaia_of_h >= 0) & (h.nc == 1) & (h.sn % 10 == 5) & (np.linalg.norm(gap, axis=1) < 600)
    pm_lon[:nh] += np.where(single, (gap * east).sum(axis=1) / (EPOCH - 1991.25), 0.0)
    pm_lat[:nh] += np.where(single, (gap * north).sum(axis=1) / (EPOCH - 1991.25), 0.0)
    print(f"Hipparcos motions corrected by the place 24.75 years later: {single.sum()}")
    both = np.flatnonzero(~has_h & has_g & has_t)
    rows_g, rows_t = ig_all[both], it_all[both]
    d_lon = (g.lon[rows_g] - t.obs_lon[rows_t] + np.pi) % (2 * np.pi) - np.pi
    own_lon = d_lon * np.cos(g.lat[rows_g]) / (EPOCH - t.epoch_lon[rows_t]) / ARCSEC * 1000
    own_lat = (g.lat[rows_g] - t.obs_lat[rows_t]) / (EPOCH - t.epoch_lat[rows_t]) / ARCSEC * 1000
    theirs = ~np.isnan(t.pm_lon[rows_t]) & (t.pflag[rows_t] == b" ")
    apart = np.hypot(own_lon - t.pm_lon[rows_t], own_lat - t.pm_lat[rows_t]) > 20
    take = theirs & apart
    turns = np.isin(rows_g, turning) & ~theirs
    pm_lon[both] = np.where(take, t.pm_lon[rows_t], np.where(turns, np.nan, own_lon))
    pm_lat[both] = np.where(take, t.pm_lat[rows_t], np.where(turns, np.nan, own_lat))
    print(f"Motions Gaia − Tycho over 24.5 yr: {len(both)}; replaced by Tycho-2's own: {take.sum()} of {theirs.sum()}")
    alone = np.flatnonzero(~has_h & ~has_g)
    pm_lon[alone], pm_lat[alone] = t_pm_lon[it_all[alone]], t_pm_lat[it_all[alone]]
    unknown = np.isnan(pm_lon)

    # Magnitudes and colours.
    colour_g = np.where(has_g, g.colour[ig_all], np.nan)
    colour_t = np.where(has_t, t.bt[it_all] - t.vt[it_all], np.nan)
    out.bv = np.where(has_h, h_bv[ih_all], np.nan)
    for other in (np.where(colour_t < 4, 0.850 * colour_t, np.nan), bv_of_gaia(colour_g)):
        out.bv = np.where(np.isnan(out.bv), other, out.bv)
    out.vmag = np.where(has_h, v_of_hipparcos(h.hp[ih_all], out.bv), np.where(has_g, mag_g[ig_all], mag_t[it_all]))
    # A Hipparcos number beside another may carry the light of both; Gaia sees them apart.
    borrowed_light = has_h & has_g & (np.where(has_h, h.variable[ih_all], 1) == 0) & (mag_g[ig_all] - out.vmag > 1.6)
    out.vmag = np.where(borrowed_light, mag_g[ig_all], out.vmag)
    print(f"Hipparcos magnitudes replaced by Gaia's, more than 1.6 fainter: {borrowed_light.sum()}")
    share_light(out, h, has_h, np.where(has_g & ~np.isnan(colour_g), mag_g[ig_all], np.nan))
    rough = np.where(has_h, np.isnan(out.bv), np.where(has_g, np.isnan(colour_g), np.isnan(colour_t)))

    # A Gaia star with no partner in the other catalogues is nearly always the companion of a brighter star beside it.
    bright = np.flatnonzero((out.vmag < 9) & ~unknown)
    lost = np.flatnonzero(unknown & has_g)
    distance, nearest = cKDTree(out.v[bright]).query(out.v[lost], distance_upper_bound=chord(15.0))
    near = np.isfinite(distance)
    pm_lon[lost[near]], pm_lat[lost[near]] = pm_lon[bright[nearest[near]]], pm_lat[bright[nearest[near]]]
    print(f"Rows without motion: {unknown.sum()}; given that of a V < 9 star within 15″: {near.sum()}")
    out.pm_lon, out.pm_lat = np.nan_to_num(pm_lon), np.nan_to_num(pm_lat)

    flags = np.where(has_g, starfiles.FROM_GAIA, np.where(has_h, starfiles.FROM_HIPPARCOS, starfiles.FROM_TYCHO))
    ccdm = np.where(has_t, np.char.strip(t.ccdm[it_all]) != b"", False)
    i, j, _ = pairs_within(out.v[out.vmag < 9], out.v[out.vmag < 9], 15.0)
    beside = np.zeros(n, bool)
    beside[np.flatnonzero(out.vmag < 9)[i[i != j]]] = True
    double = has_t & ((t.prox[it_all] <= 3.0) | ccdm | (t.posflag[it_all] == b"D"))
    double |= beside | (has_h & (h.nc[ih_all] > 1))
    photo = has_t & ~has_g & ~has_h & ((t.posflag[it_all] == b"P") | (t.pflag[it_all] == b"P"))
    for bit, where in (
        (starfiles.DOUBLE, double),
        (starfiles.VARIABLE, has_h & (h.variable[ih_all] > 0)),
        (starfiles.NO_MOTION, unknown),
        (starfiles.PHOTOCENTRE, photo),
        (starfiles.ROUGH_V, rough),
    ):
        flags = np.where(where, flags | bit, flags)
        print(f"  flag {bit:3d}: {where.sum()} rows")
    out.flags = flags.astype(np.uint8)

    out.hip = np.where(has_h, h.hip[ih_all], 0)
    out.gaia = np.where(has_g, g.id[ig_all], 0)
    out.tycho = np.where(has_t, starfiles.pack_tycho(t.tyc1, t.tyc2, t.tyc3)[it_all], 0)
    out.parallax = np.where(has_h, h_parallax[ih_all], 0.0)
    out.rv = np.where(has_h, h_rv[ih_all], np.nan)
    # The brightest stars are in the supplement only; their first component lends its identifier.
    spare = np.full(max(extra.hip.max(), h.hip.max()) + 1, 0, dtype=np.int64)
    order = np.argsort(extra.ccdm, kind="stable")[::-1]
    spare[extra.hip[order]] = starfiles.pack_tycho(extra.tyc1, extra.tyc2, extra.tyc3)[order]
    spare[0] = 0
    lent = (out.tycho == 0) & has_h
    out.tycho[lent] = spare[out.hip[lent]]
    print(f"Tycho identifiers from the supplement: {(lent & (out.tycho > 0)).sum()}")
    out.lon, out.lat = lonlat(out.v)
    return out
