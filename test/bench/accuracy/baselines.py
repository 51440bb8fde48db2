#!/usr/bin/env python3
"""Baselines of scikit-learn on a labelled split: baselines.py LEARN.jsonl SCORE.jsonl, lines {"queue", "text"}.

Prints one JSON object {"sklearn": version, "rows": [...]}. Exit code 3 when scikit-learn is absent.
Features for all four: distinct words, neighbouring words and four-letter grams within words; counts for the two naive
Bayes models (the best of five smoothings, chosen on the scored part: in the baseline's favour), tf-idf with sublinear
counts for the two linear models.
"""
import json
import re
import sys
import time

try:
    import numpy as np
    import sklearn
    from sklearn.feature_extraction.text import CountVectorizer, TfidfTransformer
    from sklearn.linear_model import LogisticRegression
    from sklearn.naive_bayes import ComplementNB, MultinomialNB
    from sklearn.svm import LinearSVC
except ImportError:
    sys.exit(3)

WORD = re.compile(r"(?u)\b\w+\b")


def tokens(text):
    words = WORD.findall(text.lower())
    yield from words
    for a, b in zip(["^"] + words, words + ["$"]):
        yield a + " " + b
    for word in words:
        padded = f" {word} "
        for i in range(max(1, len(word) - 1)):
            yield "#" + padded[i : i + 4]


def read(path):
    with open(path, encoding="utf-8") as lines:
        rows = [json.loads(line) for line in lines]
    return [row["text"] for row in rows], [row["queue"] for row in rows]


def measures(log_prob, classes, truth):
    """The same definitions as the product's replay: clip 1e-15, 15 bins, thresholds keep equal posteriors together."""
    column = {queue: i for i, queue in enumerate(classes)}
    p = np.exp(log_prob - log_prob.max(1, keepdims=True))
    p /= p.sum(1, keepdims=True)
    known = np.array([column.get(queue, -1) for queue in truth])
    true_p = np.where(known >= 0, p[np.arange(len(truth)), np.maximum(known, 0)], 0)
    top, hit = p.max(1), p.argmax(1) == known
    bins = np.minimum((top * 15).astype(int), 14)
    ece = sum((bins == b).mean() * abs(top[bins == b].mean() - hit[bins == b].mean()) for b in set(bins))
    order = np.argsort(-top, kind="stable")
    precision = np.cumsum(hit[order]) / np.arange(1, len(order) + 1)
    is_last = np.append(top[order][1:] != top[order][:-1], True)
    good = np.where((precision >= 0.95) & is_last)[0]
    return {
        "accuracy": float(hit.mean()),
        "logLoss": float(-np.log(np.clip(true_p, 1e-15, 1)).mean()),
        "calibrationError": float(ece),
        "routedAt95": float((good[-1] + 1) / len(order)) if len(good) else 0.0,
    }


def main(learn_path, score_path):
    (learn, queues), (score, truth) = read(learn_path), read(score_path)
    vectorizer = CountVectorizer(analyzer=tokens)
    x, t = vectorizer.fit_transform(learn), vectorizer.transform(score)
    weigh = TfidfTransformer(sublinear_tf=True).fit(x)
    xw, tw = weigh.transform(x), weigh.transform(t)
    rows = []

    def best_of(name, make):
        started, found = time.time(), []
        for alpha in (0.01, 0.05, 0.1, 0.5, 1.0):
            model = make(alpha).fit(x, queues)
            found.append((measures(model.predict_log_proba(t), model.classes_, truth), alpha))
        best, alpha = max(found, key=lambda each: each[0]["accuracy"])
        rows.append({"method": f"{name}, smoothing {alpha}", **best, "seconds": (time.time() - started) / 5})

    best_of("multinomial naive Bayes", lambda alpha: MultinomialNB(alpha=alpha))
    best_of("complement naive Bayes", lambda alpha: ComplementNB(alpha=alpha))
    started = time.time()
    model = LogisticRegression(C=10, max_iter=300).fit(xw, queues)
    rows.append({
        "method": "logistic regression, C 10",
        **measures(model.predict_log_proba(tw), model.classes_, truth),
        "seconds": time.time() - started,
    })
    started = time.time()
    hit = LinearSVC().fit(xw, queues).predict(tw) == np.array(truth)
    rows.append({"method": "linear support vectors, C 1", "accuracy": float(hit.mean()), "seconds": time.time() - started})
    print(json.dumps({"sklearn": sklearn.__version__, "rows": rows}))


if __name__ == "__main__":
    main(*sys.argv[1:])
