"""Quantiles of the non-central chi-square distribution, from scipy.stats.ncx2 (scipy 1.17), for test/detectors/limits."""

import json
import pathlib

from scipy.stats import ncx2

cases = [
    {"degrees": k, "noncentrality": lam, "quantiles": {str(p): float(ncx2.ppf(p, k, lam)) for p in (0.1, 0.5, 0.9)}}
    for k in (1, 2, 3)
    for lam in (4.0, 20.0, 60.0)
]
pathlib.Path(__file__).with_name("noncentral.json").write_text(json.dumps(cases, indent=1) + "\n")
