#!/usr/bin/env python3
"""Makes erfa-cases.json: time scales, Earth rotation and site vectors computed with ERFA (Debian package python3-erfa).

    /usr/bin/python3 test/detectors/sky/make-erfa-cases.py

Unlike ours it uses IAU 2006/2000A (1365 terms) and dtdb with its own topocentric terms. Dates and sites are drawn from a fixed seed.
"""
import json
import math
import os
import random

import erfa

random.seed(20261201)
SITES = [(3822626.04, -154105.65, 5086486.04), (-4483311.64, 2648815.92, -3671909.31), (6378137.0, 1200.0, -350.0)]


def case(i):
    day = random.randrange(41500, 61000)
    fraction = random.random()
    site = SITES[i % len(SITES)]
    dut1 = random.uniform(-0.8, 0.8)
    x, y = (random.uniform(-0.3, 0.5) / 206264.80624709636 for _ in range(2))
    tai = erfa.utctai(2400000.5 + day, fraction)
    tt = erfa.taitt(*tai)
    ut1 = erfa.utcut1(2400000.5 + day, fraction, dut1)
    px, py, s = erfa.xys06a(*tt)
    psi, epsilon = erfa.nut06a(*tt)
    matrix = erfa.c2t06a(tt[0], tt[1], ut1[0], ut1[1], x, y)
    gcrs = matrix.T @ site
    elongation, off_axis = math.atan2(site[1], site[0]), math.hypot(site[0], site[1]) / 1e3
    part_of_day = (ut1[0] - 2400000.5 - day) + ut1[1]
    tdb_tt = erfa.dtdb(tt[0], tt[1], part_of_day % 1.0, elongation, off_axis, site[2] / 1e3)
    return {
        "day": day, "fraction": fraction, "itrf_m": site, "ut1_minus_utc_s": dut1,
        "polar_motion_arcsec": [x * 206264.80624709636, y * 206264.80624709636],
        "tt_day": tt[0] - 2400000.5, "tt_fraction": tt[1],
        "era_rad": erfa.era00(*ut1), "pole": [px, py, s], "nutation_rad": [psi, epsilon],
        "gcrs_km": [v / 1e3 for v in gcrs], "tdb_minus_tt_s": tdb_tt,
    }


cases = [case(i) for i in range(120)]
note = "ERFA 2.0.0 through python3-erfa; IAU 2006/2000A, full dtdb with topocentric terms. Made by make-erfa-cases.py."
target = os.path.join(os.path.dirname(os.path.abspath(__file__)), "erfa-cases.json")
with open(target, "w") as f:
    json.dump({"note": note, "cases": cases}, f, default=float, indent=0)
    f.write("\n")
