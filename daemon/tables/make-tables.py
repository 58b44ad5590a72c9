#!/usr/bin/env python3
"""Makes earth-sun.bin: Earth and Sun against the solar-system barycentre, and TDB - TT, as Chebyshev series.

Run on Debian 12 or later, with the packages casacore-data-jpl-de405, python3-erfa and python3-numpy:

    /usr/bin/python3 daemon/tables/make-tables.py

Sources. Positions: the development ephemeris DE405 of the Jet Propulsion Laboratory (Standish 1998, JPL IOM 312.F-98-048), a work of
the United States government, in the public domain. TDB - TT at the geocentre: the series of Fairhead & Bretagnon 1990 (A&A 229, 240)
in its full form. It refits both on equal steps and prints how far the result is from its source.

Layout, little-endian: "SKYTABLE", 8 bytes ephemeris name, uint32 number of tables, 12 bytes free; per table (earth, sun, TDB - TT)
uint32 components, terms, steps, 4 bytes free, float64 start (MJD, TDB), float64 step (days); then the float64 coefficients of each
(step, component, order); last the SHA-256 of all that stands before it.
"""
import hashlib
import os
import struct

import erfa
import numpy as np
from numpy.polynomial import chebyshev

SOURCE = "/usr/share/casacore/data/ephemerides/DE405/table.f0i"
TARGET = os.path.join(os.path.dirname(os.path.abspath(__file__)), "earth-sun.bin")

# The source file: records of 32 days. (first double, coefficients, sub-intervals) of a body; three components, km.
FIRST_MJD, RECORD_DAYS, RECORDS = 36912, 32, 1143
EARTH_MOON, MOON, SUN = (228, 13, 2), (438, 13, 8), (750, 11, 2)
EARTH_MOON_MASS_RATIO = 81.30056

START_MJD, END_MJD = 40560, FIRST_MJD + RECORDS * RECORD_DAYS  # 1969-12-05 to 2060-01-25
LIGHT_KM_PER_S = 299792.458


def read_source():
    with open(SOURCE, "rb") as f:
        raw = f.read()
    return [np.frombuffer(raw, "<f8", 1018, 28 + 8160 * i) for i in range(RECORDS)]


def body(records, place, mjd):
    """Position of one body, km, at each of the dates (three rows)."""
    first, terms, parts = place
    days = RECORD_DAYS / parts
    out = np.empty((3, len(mjd)))
    for i, t in enumerate(mjd):
        record = min(int((t - FIRST_MJD) // RECORD_DAYS), RECORDS - 1)
        since = t - FIRST_MJD - record * RECORD_DAYS
        part = min(int(since // days), parts - 1)
        x = 2 * (since - part * days) / days - 1
        at = first + part * 3 * terms
        for k in range(3):
            out[k, i] = chebyshev.chebval(x, records[record][at + k * terms : at + (k + 1) * terms])
    return out


def earth(records, mjd):
    return body(records, EARTH_MOON, mjd) - body(records, MOON, mjd) / (1 + EARTH_MOON_MASS_RATIO)


def sun(records, mjd):
    return body(records, SUN, mjd)


def tdb_minus_tt(_, mjd):
    # With the observer on the Earth's axis (u = v = 0) nothing of the place is left in the series.
    return erfa.dtdb(2400000.5, np.asarray(mjd), 0.0, 0.0, 0.0, 0.0)[np.newaxis, :]


def refit(function, records, step_days, terms):
    """Chebyshev interpolation at the zeros of T_n, step by step."""
    steps = (END_MJD - START_MJD) // step_days
    nodes = np.cos(np.pi * (np.arange(terms) + 0.5) / terms)
    basis = np.cos(np.outer(np.arange(terms), np.arccos(nodes))) * 2 / terms
    basis[0] /= 2
    out = []
    for i in range(steps):
        values = function(records, START_MJD + (i + (nodes + 1) / 2) * step_days)
        out.append(values @ basis.T)
    return np.array(out)


def worst(function, records, table, step_days, unit):
    """Largest distance from the source, every step looked at between the fitted dates and at its ends."""
    largest = 0.0
    for i in range(len(table)):
        x = np.linspace(-1, 0.999999, 9)
        exact = function(records, START_MJD + (i + (x + 1) / 2) * step_days)
        ours = np.array([chebyshev.chebval(x, c) for c in table[i]])
        largest = max(largest, float(np.max(np.abs(ours - exact))))
    return largest * unit


def main():
    records = read_source()
    head, data = b"", b""
    plan = [
        ("Earth", earth, 8, 12, 1e9 / LIGHT_KM_PER_S),
        ("Sun", sun, 32, 11, 1e9 / LIGHT_KM_PER_S),
        ("TDB - TT", tdb_minus_tt, 16, 9, 1e9),
    ]
    for name, function, step_days, terms, unit in plan:
        table = refit(function, records, step_days, terms)
        print(f"{name}: largest difference {worst(function, records, table, step_days, unit):.3g} ns")
        head += struct.pack("<IIIIdd", table.shape[1], terms, len(table), 0, START_MJD, step_days)
        data += table.astype("<f8").tobytes()
    content = b"SKYTABLE" + b"DE405   " + struct.pack("<I", len(plan)) + bytes(12) + head + data
    with open(TARGET, "wb") as f:
        f.write(content + hashlib.sha256(content).digest())
    print(f"{TARGET}: {len(content) + 32} bytes")


main()
