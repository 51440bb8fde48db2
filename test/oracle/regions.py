#!/usr/bin/env python3
"""Writes regions.json: scores of the method's reference script on a small invented corpus.

  /usr/bin/python3 regions.py PATH_OF_REFERENCE_SCRIPT > regions.json

The reference has `REGIONS` (name to tokeniser), `Reading(kind, present, queue_of, n_queues, concentration)` with
`scores(present)`, and `fit_exponents(blocks, queue_of)`. Needs Debian's python3-sklearn.
"""
import importlib.util
import json
import random
import sys

import numpy as np
from scipy.special import logsumexp
from sklearn.feature_extraction.text import CountVectorizer

spec = importlib.util.spec_from_file_location("reference", sys.argv[1])
reference = importlib.util.module_from_spec(spec)
spec.loader.exec_module(reference)

QUEUES = ["billing", "leaks", "moving"]
COMMON = "please hello thanks my the is not since water account street can you".split()
OWN = {
    "billing": "bill charge refund paid direct debit twice amount".split(),
    "leaks": "leak burst pipe road pressure dripping stopcock puddle".split(),
    "moving": "move moving tenant landlord keys address new flat".split(),
}
random.seed(11)


def message(queue):
    return " ".join(
        random.choice(OWN[queue] if random.random() < 0.35 else OWN[random.choice(QUEUES)] if random.random() < 0.1 else COMMON)
        for _ in range(random.randint(4, 14))
    )


learn_queue = [random.choices(range(3), weights=[5, 3, 2])[0] for _ in range(60)]
score_queue = [random.randrange(3) for _ in range(20)]
learn, score = ([message(QUEUES[q]) for q in queues] for queues in (learn_queue, score_queue))
y = np.array(learn_queue)
prior = np.log(1.0 + np.bincount(y, minlength=3))
blocks, held, regions = [np.tile(prior, (len(y), 1))], [np.tile(prior, (len(score), 1))], []
for name, tokens in reference.REGIONS.items():
    vectors = CountVectorizer(analyzer=tokens, binary=True)
    a, b = vectors.fit_transform(learn).astype(float), vectors.transform(score).astype(float)
    na, nb = np.sqrt(1 + np.asarray(a.sum(1))), np.sqrt(1 + np.asarray(b.sum(1)))
    readings = []
    for kind, s in (("share", 100.0), ("presence", 1.0)):
        reading = reference.Reading(kind, a, y, 3, s)
        blocks.append(reading.leave_one_out(a, y) / na)
        held.append(reading.scores(b) / nb)
        readings.append({"kind": kind, "concentration": s, "scores": np.round(held[-1], 12).tolist()})
    rows = lambda m: [sorted(m.indices[m.indptr[i] : m.indptr[i + 1]].tolist()) for i in range(m.shape[0])]
    regions.append({"id": name, "learn": rows(a), "score": rows(b), "readings": readings})
w = reference.fit_exponents(blocks, y)
total = sum(h * v for h, v in zip(held, w))
print(json.dumps({
    "queues": QUEUES,
    "learnQueue": learn_queue,
    "regions": regions,
    "exponents": w.tolist(),
    "logProb": np.round(total - logsumexp(total, 1, keepdims=True), 12).tolist(),
}))
