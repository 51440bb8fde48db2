#!/usr/bin/env python3
"""Writes votes.json: posteriors of scikit-learn's CategoricalNB on the congressional votes of R's mlbench.

  /usr/bin/python3 votes.py > votes.json

Needs Debian's python3-sklearn, r-base-core and r-cran-mlbench. HouseVotes84: 435 members, 16 votes (y, n or none),
two parties; Congressional Quarterly Almanac, 98th Congress, UCI repository. Learns on the first 300, scores the rest.
"""
import io
import json
import subprocess

import numpy as np
import sklearn
from sklearn.naive_bayes import CategoricalNB

EXPORT = "data(HouseVotes84, package='mlbench'); write.csv(HouseVotes84, row.names = FALSE, quote = FALSE)"
table = subprocess.run(["Rscript", "-e", EXPORT], check=True, capture_output=True, text=True).stdout
rows = [line.split(",") for line in io.StringIO(table).read().splitlines()[1:]]
party = [row[0] for row in rows]
votes = ["".join({"y": "y", "n": "n", "NA": "?"}[v] for v in row[1:]) for row in rows]
x = np.array([["?ny".index(v) for v in vote] for vote in votes])
model = CategoricalNB(alpha=1.0, min_categories=3).fit(x[:300], party[:300])
print(json.dumps({
    "source": f"scikit-learn {sklearn.__version__}, CategoricalNB(alpha=1, min_categories=3); R mlbench, HouseVotes84",
    "learned": 300,
    "parties": model.classes_.tolist(),
    "party": "".join(p[0] for p in party),
    "votes": votes,
    "logProb": [[float(f"{v:.12g}") for v in row] for row in model.predict_log_proba(x[300:])],
}))
