"""Example choice against judgements: of each two sentences with a word, a reader preferred the first.

The sentences marked with a book are from novels in the public domain, in their wording; the others are invented. The
question was: which one would a dictionary print?
"""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

import colloc
from colloc.answers.concordance import merits

from .conftest import CORPORA, Demo, write_documents

JUDGED: dict[str, tuple[str, str, str]] = {
    # word: (better, worse, why)
    "lantern": (
        "Ursula saw a man with a lantern come out of a farm by the railway, and cross to the dark farm-buildings.",
        "The lantern was nearer to him; he lay flat upon his face on the coping, and then lowering himself upon the "
        "garden side to the full length of his arms, he let go.",
        "shorter, needs nothing said before (Lawrence, Women in Love; Mason, Clementina)",
    ),
    "umbrella": (
        "At half-past nine he set out and struggled with his shabby umbrella against wind and rain.",
        '"But he said—something about a concert and an umbrella—"',
        "a whole sentence against a broken reply (Gissing, New Grub Street; Forster, Howards End)",
    ),
    "kettle": (
        "Even as she spoke she was pouring water into a little kettle, and lighting a spirit lamp.",
        "I've put th' kettle on, and you and Mary shall ha' a dish o' tea in no time.\"",
        "common words, no open quotation (Belloc Lowndes, The Chink in the Armour; Gaskell, Mary Barton)",
    ),
    "orchard": (
        "All the day through she wandered in the cool dewy orchard ways.",
        "Had any one pointed it out to him he would have taken the speaker into his orchard, and said:",
        "ends where it ends (Ouida, Wanda)",
    ),
    "candle": (
        "The candle was brought up again, feebly burning, and then some water was cast in.",
        "“Will you have the candle, or can you see?”",
        "tells what a candle does (Dickens, Hard Times; Caird, The Daughters of Danaus)",
    ),
    "bridge": (
        "Every now and then the party crossed a bridge.",
        "“On the bridge—did you say on the bridge, friend?”",
        "stands alone (Nesbit, The Railway Children; Ainsworth, Auriol)",
    ),
    "ladder": (
        "The mate went to the ladder and descended into the hold.",
        "You'll have to come over the chimneys; wait till I get a ladder.'",
        "no open quotation (Baring-Gould, In the Roar of the Sea; Gissing, New Grub Street)",
    ),
    "harbourmaster": (
        "The harbourmaster counts the boats every evening before he goes home.",
        "This was what the harbourmaster had meant by it, and they knew it.",
        "says what such a man does; the other points back four times",
    ),
    "gangway": (
        "Passengers walk down the gangway one after the other.",
        "Gangway, Quay, Harbour Office, Ticket Hall, Waiting Room, Luggage Store",
        "a sentence against a list",
    ),
    "tariff": (
        "The new tariff made bread dearer in every town.",
        "Tariff 14b (1887): 3s 6d, 4s 2d, 5s 9d, 6s, 7s 11d per 100 lb, see 23",
        "words against numbers",
    ),
    "anchor": (
        "The crew let the anchor fall as soon as the wind dropped.",
        "the anchor and the chain and",
        "a fragment",
    ),
    "paddle": (
        "A broken paddle lay on the beach below the old house.",
        "Messrs Paddle, Hartwick, Penrose, Oddlestone and Mudge of Trewarne Court, Saltby",
        "names only",
    ),
    "compass": (
        "Without a compass nobody finds the way home in fog.",
        "Compass?",
        "one word is no example",
    ),
    "rudder": (
        "The storm broke the rudder, and the ship drifted for two days.",
        "But then the rudder too, and so therefore they (as the quarterdeck's hydrographical exegete propounded "
        "adumbratively",
        "common words against rare ones and an open bracket",
    ),
}


@pytest.fixture(scope="module")
def judged(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Every sentence as a document of its own, among other text that says which words are common."""
    folder = tmp_path_factory.mktemp("judged")
    texts = {
        f"{word}-{name}": sentence
        for word, (better, worse, _) in JUDGED.items()
        for name, sentence in (("better", better), ("worse", worse))
    }
    for name in ("logbooks.jsonl", "notices.jsonl"):
        lines = (CORPORA / name).read_text(encoding="utf-8").splitlines()[:60]
        texts |= {f"{name}-{row}": json.loads(line)["text"] for row, line in enumerate(lines)}
    colloc.build(folder / "judged.colloc", [write_documents(folder / "judged.jsonl", texts)], jobs=1)
    return folder / "judged.colloc"


@pytest.mark.parametrize("word", JUDGED)
def test_the_better_sentence_wins(judged: Path, word: str) -> None:
    answer = colloc.lines(judged, word, best=True, limit=0)
    mine = [name for name in answer["document"] if name.startswith(f"{word}-")]
    assert mine[0] == f"{word}-better"


def test_other_documents_come_first_and_nothing_twice(demo: Demo) -> None:
    answer = colloc.lines(demo.store, "fog", best=True, limit=6)
    assert len(set(answer["document"])) == 6
    words = [set((row["before"] + row["match"] + row["after"]).lower().split()) for row in answer]
    for one in range(6):
        for other in range(one):
            assert len(words[one] & words[other]) <= 0.55 * len(words[one] | words[other])
    again = colloc.lines(demo.store, "fog", best=True, limit=6)
    assert again == answer


def test_pairs_stand_whole_in_their_example(demo: Demo) -> None:
    answer = colloc.lines(demo.store, "trimmed", "wick", best=True, limit=5)
    for row in answer:
        sentence = row["before"] + row["match"] + row["after"]
        assert "trimmed" in sentence.lower()
        assert "wick" in sentence.lower()
        assert sentence[0].isupper()
        assert sentence[-1] in ".!?"


def test_points_are_those_of_the_documentation() -> None:
    assert merits.length_points(8) == merits.length_points(20) == 0
    assert merits.length_points(5) == pytest.approx(-0.36)
    assert merits.length_points(30) == pytest.approx(-0.5)
    assert merits.commonness(np.array([0.0, 999.0, 1e5])).tolist() == pytest.approx([0.0, 1.0, 1.0])
    assert merits.text_points("The fog came in.", ["The", "fog", "came", "in"]) == 0
    assert merits.text_points("the fog came in.", ["the", "fog", "came", "in"]) == pytest.approx(-1.5)
    assert merits.text_points("The fog came in", ["The", "fog", "came", "in"]) == pytest.approx(-1.5)
    assert merits.text_points("The fog (thick.", ["The", "fog", "thick"]) == pytest.approx(-0.7)
    assert merits.text_points("海は静かだった。", list("海は静かだった")) == 0
    assert merits.backward_points(["it", "rains"]) == pytest.approx(-1.0)
    assert merits.backward_points(["rain", "on", "it", "now"]) == pytest.approx(-1.5 / 4)
