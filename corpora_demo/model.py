"""The whole language in one place: all rules, read once, with the contexts they depend on."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np

from corpora_demo.common_rules import COMMON_RULES
from corpora_demo.contexts import Contexts, all_contexts
from corpora_demo.grammar import Floats, Rule, Sampler, read_rules
from corpora_demo.log_rules import LOG_RULES
from corpora_demo.notice_rules import NOTICE_RULES
from corpora_demo.vocabulary import LISTS, TOPICS

ROOTS = {
    "log": ("LOG_OPENING", "LOG_BODY", "LOG_CLOSING"),
    "notice": ("NOTICE_OPENING", "NOTICE_BODY", "NOTICE_CLOSING"),
}
"""The rule that writes a document's first, middle and last sentences."""
BURST_ROOT = "LOG_BURST"


@dataclass(frozen=True)
class Model:
    """Rules and contexts, and the sampler made of them."""

    contexts: Contexts
    rules: dict[str, list[Rule]]
    sampler: Sampler

    def probability(self, name: str, *symbols: str) -> Floats:
        """Probability of one rule, given its name, by context (or one value for all)."""
        (rule,) = (rule for rule in self.rules[name] if rule.symbols == symbols)
        return np.asarray(rule.probability)


def _lists() -> dict[str, str]:
    lists = {name: words.split() for name, words in LISTS.items()}
    for topics in TOPICS.values():
        lists |= {f"TOPIC_{topic.upper()}": list(words) for topic, words in topics.items()}
    return {name: "\n".join(f"1 | {word.replace('_', ' ')}" for word in words) for name, words in lists.items()}


@cache
def model() -> Model:
    """The model, built at the first call (a tenth of a second) and kept."""
    contexts = all_contexts()
    rules = read_rules(_lists() | COMMON_RULES | LOG_RULES | NOTICE_RULES, contexts)
    return Model(contexts, rules, Sampler(rules, contexts))
