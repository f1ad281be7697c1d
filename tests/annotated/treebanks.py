"""Annotated text for tests: made by the seed with everything CoNLL-U has, or the open treebank where it is at hand.

The reader here is plain Python after the format's description (universaldependencies.org, "CoNLL-U Format") and shares
nothing with the package.
"""

from __future__ import annotations

import gzip
import os
import random
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

FORMS = ["sea", "Sea", "fog", "bells", "Straße", "n't", "'s", ",", "naïve", "naı̈ve", "_", "New York", "😀", "ring", "a"]
CLASSES = ["NOUN", "ADJ", "VERB", "ADP", "PUNCT", "_"]
RELATIONS = ["nsubj", "obj", "nmod", "nmod:poss", "compound:prt", "punct", "amod"]
FEATS = ["_", "Number=Sing", "Number=Plur|Person=3"]
OPEN_DATA = [f"en_ewt-{part}.conllu.gz" for part in ("train", "dev", "test")]
"""Universal Dependencies English Web Treebank, CC BY-SA 4.0."""


@dataclass(frozen=True)
class Word:
    """One word line."""

    form: str
    lemma: str
    upos: str
    head: str
    relation: str


def sentence(chance: random.Random, number: int, document: str) -> str:
    """A sentence with a random tree, and now and then ranges, empty nodes and oddities."""
    n = chance.randint(1, 12)
    order = chance.sample(range(1, n + 1), n)
    heads = {order[0]: 0}
    for place, word in enumerate(order[1:], 1):
        heads[word] = chance.choice(order[:place])
    lines = [f"# sent_id = {document}-{number}", "# text = not what is tested", "#odd comment"]
    if number % 3 == 0:
        lines.insert(0, f"# newpar id = {document}-p{number}")
    ranged = chance.randint(1, n - 1) if n > 1 and chance.random() < 0.4 else 0
    if chance.random() < 0.1:
        lines.append("0.1\t" + "\t".join(["dropped", "drop", "VERB", "_", "_", "_", "_", "0:root", "CopyOf=1"]))
    for word in range(1, n + 1):
        form = chance.choice(FORMS)
        misc = chance.choice(["_", "_", "SpaceAfter=No", "Gloss=x|SpaceAfter=No", "NewPar=Yes"])
        if word == ranged:
            lines.append(f"{word}-{word + 1}\t{chance.choice(['du', 'cannot'])}" + "\t_" * 7 + f"\t{misc}")
        relation = "root" if heads[word] == 0 else chance.choice(RELATIONS)
        head = str(heads[word])
        if chance.random() < 0.03:
            head, relation = "_", chance.choice(["_", "dep"])
        lemma = chance.choice([form.lower(), "_"])
        fields = [str(word), form, lemma, chance.choice(CLASSES), chance.choice(["NN", "_"]), chance.choice(FEATS)]
        lines.append("\t".join([*fields, head, relation, chance.choice(["_", f"{head}:{relation}"]), misc]))
        if chance.random() < 0.05:
            lines.append(f"{word}.1\t" + "\t".join(["empty", "_", "X", "_", "_", "_", "_", "1:dep", "_"]))
    return "\n".join(lines) + "\n\n"


def treebank(seed: int, documents: int = 6, sentences: int = 15) -> str:
    """A whole file; its documents have metadata, and the first stands without ``# newdoc``."""
    chance = random.Random(seed)
    parts = []
    for number in range(documents):
        name = f"d{seed}-{number}"
        if number:
            parts.append(f"# newdoc id = {name}\n# meta::genre = {chance.choice(['press', 'mail'])}\n")
        parts += [sentence(chance, place, name) for place in range(1, sentences + 1)]
    return "".join(parts)


def treebank_files(folder: Path) -> list[Path]:
    """The open treebank, unpacked, where ``COLLOC_DATA`` names its folder; otherwise two made files."""
    data = os.environ.get("COLLOC_DATA")
    files = []
    if data:
        for name in OPEN_DATA:
            files.append(folder / name.removesuffix(".gz"))
            files[-1].write_bytes(gzip.decompress((Path(data) / name).read_bytes()))
    else:
        for seed in (1, 2):
            files.append(folder / f"made-{seed}.conllu")
            files[-1].write_text(treebank(seed, documents=12, sentences=40), encoding="utf-8")
    return files


def read_sentences(text: str) -> Iterator[list[Word]]:
    """Words of each sentence, by the plain rules."""
    for block in text.split("\n\n"):
        rows = [line.split("\t") for line in block.split("\n") if line and not line.startswith("#")]
        words = [Word(row[1], row[2], row[3], row[6], row[7]) for row in rows if row[0].isdigit()]
        if words:
            yield words


def relation_counts(text: str) -> Counter[tuple[str, str, str]]:
    """How often each (relation, head's lemma, dependent's lemma) occurs; words without a lemma left out."""
    counts: Counter[tuple[str, str, str]] = Counter()
    for words in read_sentences(text):
        for word in words:
            if word.head not in ("_", "0"):
                head = words[int(word.head) - 1]
                lemmas = [one.lemma if one.lemma != "_" or one.form == "_" else "" for one in (head, word)]
                if all(lemmas):
                    counts[word.relation, lemmas[0], lemmas[1]] += 1
    return counts
