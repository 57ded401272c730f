"""TDB−TT at the Earth's centre by the largest terms of the series of Fairhead & Bretagnon (1990, A&A 229, 240).

The terms kept agree with the whole series of 787 (ERFA's `dtdb`) to 5 µs within 1550–2650 and 25 µs within −3000–3000;
10 µs move the Moon by a centimetre. The daily term at the observer (2 µs) is left out.
"""

import math

import numpy as np

from colure.arrays import Float

# Amplitude in µs, frequency in radians a Julian millennium, phase in radians.
_T0 = (
    (1656.674564, 6283.075849991, 6.240054195),
    (22.417471, 5753.384884897, 4.296977442),
    (13.839792, 12566.151699983, 6.196904410),
    (4.770086, 529.690965095, 0.444401603),
    (4.676740, 6069.776754553, 4.021195093),
    (2.256707, 213.299095438, 5.543113262),
    (1.694205, -3.523118349, 5.025132748),
    (1.554905, 77713.771467920, 5.198467090),
    (1.276839, 7860.419392439, 5.988822341),
    (1.193379, 5223.693919802, 3.649823730),
    (1.115322, 3930.209696220, 1.422745069),
)
_T1 = ((102.156724, 6283.075849991, 4.249032005), (1.706807, 12566.151699983, 4.205904248))
_T2 = ((4.322990, 6283.075849991, 2.642893748), (0.406495, 0.0, 4.712388980))


def tdb_minus_tt(jd1: Float | float, jd2: Float | float) -> Float | float:
    """Return TDB−TT in seconds at Julian dates (TT, or TDB: the difference does not matter here).

    Scalars take and return Python floats.
    """
    if isinstance(jd1, float) and isinstance(jd2, float):
        t = ((jd1 - 2451545.0) + jd2) / 365250.0
        sin = math.sin
        w0 = w1 = w2 = 0.0
        for a, f, p in _T0:
            w0 += a * sin(f * t + p)
        for a, f, p in _T1:
            w1 += a * sin(f * t + p)
        for a, f, p in _T2:
            w2 += a * sin(f * t + p)
        return 1e-6 * (w0 + t * (w1 + t * w2))
    millennia = np.asarray(((jd1 - 2451545.0) + np.asarray(jd2)) / 365250.0)
    # Only the annual term needs double precision: single costs the others 0.05 µs at most and is ten times faster.
    t32 = millennia.astype(np.float32)
    total = np.zeros_like(t32)
    for terms in (_T2, _T1, _T0[1:]):
        total *= t32
        for amplitude, frequency, phase in terms:
            total += np.float32(amplitude) * np.sin(np.float32(frequency) * t32 + np.float32(phase))
    amplitude, frequency, phase = _T0[0]
    return np.asarray(1e-6 * (amplitude * np.sin(frequency * millennia + phase) + total))
