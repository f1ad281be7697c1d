"""References as BibTeX, from the catalogue of measures and from the list of procedures."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace

from colloc.errors import UsageError
from colloc.measures.catalogue import MEASURES

_CITED = re.compile(r"^(?P<authors>.+?) (?P<year>\d{4})\b[, ]*(?P<rest>.*)$", re.DOTALL)
_DOI = re.compile(r"doi:(10\.\d+/[^\s,;()]+)")

PROCEDURES: Mapping[str, str] = {
    "words and sentences": "Davis 2025, Unicode Text Segmentation, Unicode Standard Annex 29",
    "q-values": "Benjamini & Hochberg 1995, Journal of the Royal Statistical Society B 57(1), 289-300",
    "rank sum test": "Mann & Whitney 1947, Annals of Mathematical Statistics 18(1), doi:10.1214/aoms/1177730491",
    "test of means": "Welch 1947, Biometrika 34(1-2), doi:10.1093/biomet/34.1-2.28",
    "adjusted p-values": "Westfall & Young 1993, Resampling-Based Multiple Testing, Wiley",
    "jackknife": "Kott 2001, Journal of Official Statistics 17(4), 521-526",
    "log odds difference": "Woolf 1955, Annals of Human Genetics 19(4), doi:10.1111/j.1469-1809.1955.tb01348.x",
    "two-cell log-likelihood": "Rayson & Garside 2000, Workshop on Comparing Corpora, ACL Anthology W00-0901",
    "log-likelihood": "Dunning 1993, Computational Linguistics 19(1), ACL Anthology J93-1003",
    "pooled odds ratio": "Mantel & Haenszel 1959, Journal of the National Cancer Institute 22(4), 719-748",
    "homogeneity": "Breslow & Day 1980, Statistical Methods in Cancer Research 1, IARC",
    "groups of documents": "Kruskal & Wallis 1952, Journal of the American Statistical Association 47, 583-621",
    "trend over periods": "Mann 1945, Econometrica 13(3), doi:10.2307/1907187",
    "slope over documents": "MacKinnon & White 1985, Journal of Econometrics 29(3), doi:10.1016/0304-4076(85)90158-7",
    "t for differences": "Church, Gale, Hanks & Hindle 1991, in Lexical Acquisition, Erlbaum, 115-164",
    "dispersion": "Gries 2008, International Journal of Corpus Linguistics 13(4), doi:10.1075/ijcl.13.4.02gri",
}
"""Every procedure that a methods paragraph may name, with its reference."""


@dataclass(frozen=True, slots=True)
class Reference:
    """One entry.

    Attributes
    ----------
    key : str
        ``church-hanks-1990``.
    authors : tuple of str
    year : str
    rest : str
        Where it appeared, as the catalogue has it.
    """

    key: str
    authors: tuple[str, ...]
    year: str
    rest: str

    @property
    def short(self) -> str:
        """As a paragraph cites it: ``Church & Hanks 1990``."""
        names = self.authors
        joined = names[0] if len(names) == 1 else f"{', '.join(names[:-1])} & {names[-1]}"
        return f"{joined} {self.year}"

    def bibtex(self) -> str:
        """The entry; ``misc``, since the catalogue does not part journals from books."""
        doi = _DOI.search(self.rest)
        fields = {"author": " and ".join(self.authors), "year": self.year}
        if doi:
            fields["doi"] = doi[1]
        note = _DOI.sub("", self.rest).strip(" ,;")
        if note:
            fields["note"] = note
        return entry("misc", self.key, fields)


def references_of(measures: Iterable[str], procedures: Iterable[str] = ()) -> dict[str, list[Reference]]:
    """References by what they are cited for; empty where there is no single source.

    Raises
    ------
    UsageError
        A measure is not in the catalogue.
    """
    found: dict[str, list[Reference]] = {}
    for name in measures:
        if name not in MEASURES:
            raise UsageError(f"unknown measure {name!r}: choose from {', '.join(MEASURES)}")
        found[MEASURES[name].title] = _parsed(MEASURES[name].source)
    for name in procedures:
        found[name] = _parsed(PROCEDURES[name])
    return found


def _parsed(source: str) -> list[Reference]:
    """The references of a catalogue entry: parts between semicolons that begin with names and a year.

    Other parts (where to find it) belong to the reference before them.
    """
    found: list[Reference] = []
    for part in source.split("; "):
        # "0.5: Haldane 1956" cites Haldane for the 0.5.
        cited = _CITED.match(part.rsplit(": ", 1)[-1] if re.match(r"^[^A-Z]*: ", part) else part)
        authors = tuple(re.split(r", | & ", cited["authors"])) if cited is not None else ()
        if cited is not None and all(re.fullmatch(r"[A-Z][\w'-]+(?: [A-Z][\w'-]+)*", name) for name in authors):
            key = "-".join([*(re.sub(r"\W+", "", name).lower() for name in authors), cited["year"]])
            found.append(Reference(key, authors, cited["year"], cited["rest"].strip()))
        elif found:
            found[-1] = replace(found[-1], rest=f"{found[-1].rest}; {part}")
    return found


def entry(kind: str, key: str, fields: Mapping[str, str]) -> str:
    """A BibTeX entry; braces and what TeX takes for commands are made harmless."""
    lines = [f"  {name} = {{{_escaped(value)}}}" for name, value in fields.items()]
    return f"@{kind}{{{key},\n" + ",\n".join(lines) + "\n}"


def _escaped(text: str) -> str:
    replaced = {"\\": "\\textbackslash ", "{": "\\{", "}": "\\}", "&": "\\&", "%": "\\%", "#": "\\#", "_": "\\_"}
    return "".join(replaced.get(character, character) for character in text)
