#!/usr/bin/env python3
"""The work of barycentre.ts as far as astropy does it: site UTC to TDB and the light path to the solar-system barycentre.

Called by barycentre.ts with: SPK kernel, folder for astropy's cache, number of arrivals. All arrivals are handed over as one array,
which is how the library is fastest. Prints as JSON: arrivals per second of processor time in each round, version, and TDB - TT plus
light path of every hundredth arrival, s.
"""
import json
import os
import sys
import time

kernel, cache, count = sys.argv[1], sys.argv[2], int(sys.argv[3])
os.environ["XDG_CACHE_HOME"] = os.environ["XDG_CONFIG_HOME"] = cache
os.makedirs(os.path.join(cache, "astropy"), exist_ok=True)

import astropy
import numpy as np
from astropy import constants
from astropy import units as u
from astropy.coordinates import (
    CartesianRepresentation,
    EarthLocation,
    get_body_barycentric,
    solar_system_ephemeris,
)
from astropy.time import Time
from astropy.utils import iers

iers.conf.auto_download = False
iers.earth_orientation_table.set(iers.IERS_B.open(iers.IERS_B_FILE))
solar_system_ephemeris.set("file://" + kernel)

i = np.arange(count)
day, fraction = 2450000.5 + i % 9900, (i * 0.618034) % 1
site = EarthLocation.from_geocentric(3822626.04, -154105.65, 5086486.04, unit=u.m)
towards = CartesianRepresentation(np.cos(0.54) * np.cos(1.1), np.cos(0.54) * np.sin(1.1), np.sin(0.54))


def delays():
    # Not Time.light_travel_time, which takes the site through stellar aberration on its way to the ICRS: up to 2.1 us.
    times = Time(day, fraction, format="jd", scale="utc", location=site)
    tdb = times.tdb
    observer = get_body_barycentric("earth", times) + site.get_gcrs_posvel(times)[0]
    return tdb, times.tt, towards.dot(observer) / constants.c


rates = []
for _ in range(3):
    start = time.process_time()
    tdb, tt, path = delays()
    rates.append(count / (time.process_time() - start))

# TDB - TT from the two-part dates, so that no digit is lost.
tdb_minus_tt = ((tdb.jd1 - tt.jd1) + (tdb.jd2 - tt.jd2)) * 86400
check = (tdb_minus_tt + path.to_value("s"))[::100]
print(json.dumps({"version": astropy.__version__, "rates": rates, "check": [float(value) for value in check]}))
