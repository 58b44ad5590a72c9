#!/usr/bin/env python3
"""Makes orientation-cases.json: site vectors with measured Earth orientation, by ERFA and astropy (Debian python3-astropy 5.2.1).

    /usr/bin/python3 test/detectors/sky/make-orientation-cases.py

The rows are the IERS's own, as Debian's python3-astropy packages them: EOP 14 C04 (IAU 2000) around the leap second of
2016-12-31. They are read and interpolated by astropy, turned into a site vector by ERFA (IAU 2006/2000A, 1365 terms).
"""
import json
import os
import random

import erfa
import numpy as np
from astropy.utils import iers

FIRST, LAST = 57739, 57769
SITES = [(3822626.04, -154105.65, 5086486.04), (-4483311.64, 2648815.92, -3671909.31)]

with open(iers.IERS_B_FILE) as f:
    rows = [line.rstrip("\n") for line in f if line[:4].isdigit() and FIRST <= int(line.split()[3]) <= LAST]

table = iers.IERS_B.open(iers.IERS_B_FILE)
random.seed(20261202)


def case(i):
    # Every other one close to the leap second at the end of MJD 57753.
    day = random.randrange(FIRST, LAST) if i % 2 else 57753 + i // 2 % 2
    fraction = random.random()
    jd = 2400000.5 + day
    dut1 = float(table.ut1_utc(jd, fraction)[()].value)
    x, y = (float(p.to_value("arcsec")) for p in table.pm_xy(jd, fraction))
    tt = erfa.taitt(*erfa.utctai(jd, fraction))
    ut1 = erfa.utcut1(jd, fraction, dut1)
    matrix = erfa.c2t06a(tt[0], tt[1], ut1[0], ut1[1], np.deg2rad(x / 3600), np.deg2rad(y / 3600))
    site = SITES[i % len(SITES)]
    return {
        "day": day, "fraction": fraction, "itrf_m": site, "ut1_minus_utc_s": dut1, "polar_motion_arcsec": [x, y],
        "gcrs_km": [float(v) / 1e3 for v in matrix.T @ site],
    }


note = "IERS EOP 14 C04 rows from Debian's python3-astropy 5.2.1; cases by astropy and ERFA. Made by make-orientation-cases.py."
target = os.path.join(os.path.dirname(os.path.abspath(__file__)), "orientation-cases.json")
with open(target, "w") as f:
    json.dump({"note": note, "c04": rows, "cases": [case(i) for i in range(60)]}, f, indent=0)
    f.write("\n")
