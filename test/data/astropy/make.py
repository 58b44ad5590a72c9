#!/usr/bin/env python3
"""Writes the arrival files of this folder with astropy, which reads and writes FITS and VOTable by itself.

Written with astropy 5.2.1 (Debian 12, python3-astropy):  /usr/bin/python3 test/data/astropy/make.py
The test that reads them states the same numbers once more, digit by digit.
"""
import os
import sys

import astropy
import numpy as np
from astropy.io import fits
from astropy.io.votable import from_table
from astropy.table import MaskedColumn, Table

here = os.path.dirname(os.path.abspath(__file__))
TEXTS = ["60975.8912345678901234", "60976.0000000000000001", "61000.9999999999999999"]
PULSARS = ["KR 0417+31", "KR 0009-1", "KR 0417+31"]


def common():
    table = Table()
    table["pulsar"] = PULSARS
    table["uncertainty_us"] = np.array([38.2, 0.125, 7.0], dtype=np.float32)
    table["frequency_mhz"] = np.array([1400.25, np.inf, 350.1], dtype=np.float64)
    table["site"] = ["ridge", "coast", "ridge"]
    table["receiver"] = ["ridge-1400", "", "L"]
    table["pulse_number"] = MaskedColumn(np.array([-17, 9007199254740991, 0], dtype=np.int64), mask=[False, False, True])
    table["signal_to_noise"] = np.array([23.5, np.nan, 8.1], dtype=np.float32)
    return table


def as_text():
    table = common()
    table["mjd_utc"] = TEXTS
    return table


def as_two():
    """The day and its fraction, each a column of its own; the uncertainty in seconds."""
    table = common()
    table["mjd_utc"] = np.array([60975, 60976, 61000], dtype=np.int32)
    table["mjd_utc_fraction"] = np.array([float("0." + text.split(".")[1]) for text in TEXTS])
    table["uncertainty_us"] = np.array([38.2e-6, 0.125e-6, 7e-6])
    table["uncertainty_us"].unit = "s"
    return table


def scaled():
    """Whole numbers with TSCAL, TZERO and TNULL, in the third HDU, behind a picture."""
    columns = fits.ColDefs([
        fits.Column(name="PULSAR", format="12A", array=np.array(PULSARS)),
        fits.Column(name="MJD_UTC", format="24A", array=np.array(TEXTS)),
        fits.Column(name="UNCERTAINTY_US", format="J", array=np.array([382, 1, 70]), unit="us"),
        fits.Column(name="FREQUENCY_MHZ", format="J", array=np.array([1400250, 1400250, 350100]), unit="kHz"),
        fits.Column(name="SITE", format="5A", array=np.array(["ridge", "coast", "ridge"])),
        fits.Column(name="PULSE_NUMBER", format="I", null=-1, array=np.array([5, -1, 7], dtype=np.int16)),
        fits.Column(name="PROFILE", format="PE()", array=np.array([[1.0, 2.0], [3.0], [4.0]], dtype=object)),
    ])
    rows = fits.BinTableHDU.from_columns(columns)
    # astropy scales 32-bit whole numbers when it reads, but refuses to when it writes: the cards are set by hand.
    rows.header["TSCAL3"] = 0.1
    return fits.HDUList([fits.PrimaryHDU(), fits.ImageHDU(np.zeros((7, 5), dtype=np.int16)), rows])


def votable(name, table, form):
    document = from_table(table)
    document.version = "1.4"
    for field in document.iter_fields_and_params():
        if field.datatype == "long":
            field.values.null = -9999
    document.to_xml(os.path.join(here, name), tabledata_format=form)


if astropy.__version__ != "5.2.1":
    sys.exit("written for astropy 5.2.1; the committed files were made with it")
as_text().write(os.path.join(here, "text.fits"), overwrite=True)
as_two().write(os.path.join(here, "two-columns.fits"), overwrite=True)
scaled().writeto(os.path.join(here, "scaled.fits"), overwrite=True)
votable("tabledata.vot", as_text(), "tabledata")
votable("binary2.vot", as_text(), "binary2")
votable("two-columns-binary2.vot", as_two(), "binary2")
