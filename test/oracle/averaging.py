#!/usr/bin/env python3
"""Writes averaging.json: the blocks that are averaged over concentrations, computed the long way from their definition.

  /usr/bin/python3 averaging.py regions.json > averaging.json

Every message is counted again for every score (a message that is scored leave-one-out is simply not counted), every
logarithm is taken in the open, and nothing is shared between tokens. Needs Debian's python3-scipy.
"""
import json
import sys

import numpy as np
from scipy.special import betaln, logsumexp

GRID = {"tokens": [3.0, 30.0, 300.0, 3000.0], "messages": [0.3, 3.0, 30.0, 300.0]}
corpus = json.load(open(sys.argv[1]))
queues, learn_queue = len(corpus["queues"]), corpus["learnQueue"]


def blocks(learned, message, draws):
    """[for, against, absent][queues] of one message; learned: (queue, tokens) of the messages counted."""
    held = sorted({t for _, tokens in learned for t in tokens})
    d = {t: np.zeros(queues) for t in held}
    messages = np.zeros(queues)
    for k, tokens in learned:
        messages[k] += 1
        for t in tokens:
            d[t][k] += 1
    exposure = sum(d.values()) if draws == "tokens" else messages
    whole = exposure.sum()
    total = [np.zeros(queues) for _ in range(3)]
    for t in held:
        m = (d[t].sum() + 0.5) / (whole + 0.5 * len(held)) if draws == "tokens" else (d[t].sum() + 0.5) / (whole + 1)
        log_evidence = [
            (betaln(s * m + d[t], s * (1 - m) + exposure - d[t]) - betaln(s * m, s * (1 - m))).sum() for s in GRID[draws]
        ] + [(d[t] * np.log(m) + (exposure - d[t]) * np.log(1 - m)).sum()]
        weight = np.exp(np.array(log_evidence) - logsumexp(log_evidence))
        p = weight[-1] * m + sum(w * (s * m + d[t]) / (s + exposure) for w, s in zip(weight, GRID[draws]))
        if t in message:
            total[0] += np.maximum(np.log(p / m), 0)
            total[1] += np.minimum(np.log(p / m), 0)
        elif draws == "messages":
            total[2] += np.log((1 - p) / (1 - m))
    return [(x / np.sqrt(1 + len(message))).round(12).tolist() for x in total]


out = []
for region in corpus["regions"]:
    learned = list(zip(learn_queue, region["learn"]))
    out.append({
        "id": region["id"],
        "scores": {d: [blocks(learned, m, d) for m in region["score"]] for d in GRID},
        "leaveOneOut": {d: [blocks(learned[:i] + learned[i + 1 :], learned[i][1], d) for i in range(12)] for d in GRID},
    })
print(json.dumps(out))
