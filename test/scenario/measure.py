"""How hard the scenario is for plain multinomial counts (scikit-learn), on the text alone.

    python3 test/scenario/measure.py FILE.jsonl

FILE is what write-labelled.ts writes. Prints the accuracy of MultinomialNB on three random 70/30 splits, on the
split by time, and predict-then-learn in order of arrival (words and pairs).
"""

import email
import email.policy
import json
import re
import sys

import numpy as np
from sklearn.feature_extraction.text import CountVectorizer
from sklearn.naive_bayes import MultinomialNB


def text_of(row):
    if "form" in row:
        return " ".join(row["form"]["fields"].values())
    mail = email.message_from_bytes(row["mail"].encode(), policy=email.policy.default)
    body = mail.get_body(preferencelist=("plain", "html"))
    text = body.get_content() if body else ""
    if body is not None and body.get_content_type() == "text/html":
        text = re.sub("<[^>]+>", " ", re.sub(r"<style>.*?</style>", "", text, flags=re.S))
    return (mail["subject"] or "") + " " + text


with open(sys.argv[1], encoding="utf-8") as lines:
    rows = [json.loads(line) for line in lines]
queues = np.array([row["queue"] for row in rows])
counts = CountVectorizer(token_pattern=r"(?u)\b\w+\b").fit_transform(text_of(row) for row in rows)
cut = int(0.7 * len(rows))
orders = {f"random split {seed}": np.random.RandomState(seed).permutation(len(rows)) for seed in range(3)}
orders["split by time"] = np.arange(len(rows))
for name, order in orders.items():
    learn, score = order[:cut], order[cut:]
    for alpha in (1, 0.1):
        model = MultinomialNB(alpha=alpha).fit(counts[learn], queues[learn])
        print(f"{name}, alpha {alpha}: {(model.predict(counts[score]) == queues[score]).mean():.3f}")
# In order of arrival, predict then learn, on distinct words and neighbouring words.
pairs = CountVectorizer(token_pattern=r"(?u)\b\w+\b", ngram_range=(1, 2), binary=True)
counts = pairs.fit_transform(text_of(row) for row in rows)
for alpha in (1, 0.1):
    model = MultinomialNB(alpha=alpha).partial_fit(counts[:1], queues[:1], classes=sorted(set(queues)))
    hits = []
    for i in range(1, len(rows)):
        hits.append(model.predict(counts[i])[0] == queues[i])
        model.partial_fit(counts[i], queues[i : i + 1])
    print(f"in order, alpha {alpha}: all {np.mean(hits):.4f}, after 300 {np.mean(hits[299:]):.4f}", flush=True)
