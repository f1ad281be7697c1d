"""The body of a TEI document: its running text, or the words it marks."""

from __future__ import annotations

from collections.abc import Mapping

from colloc.text.markup.flow import PARAGRAPH_END, Flow

COLUMNS = ("form", "lemma", "upos", "misc")
"""Columns of the lines that stand for marked words."""

_BLOCK_NAMES = (
    "ab argument body byline camera caption castGroup castItem castList cell closer dateline desc div div1 div2 div3 "
    "div4 div5 div6 div7 docAuthor docDate docEdition docImprint docTitle entry entryFree epigraph figDesc figure "
    "floatingText formula group head imprimatur index item label lg list listBibl move opener p postscript row "
    "salute signed sp speaker stage table tech text titlePage titlePart trailer u view"
)
_BLOCKS = frozenset(_BLOCK_NAMES.split())
_ASIDE = frozenset(("note",))
"""Read after the paragraph in which they stand, so that its sentences stay whole."""
_LEFT_OUT = frozenset(("del", "fw", "gap", "graphic", "media", "metamark", "rdg", "teiHeader", "notatedMusic"))
_CHOSEN_AGAINST = frozenset(("abbr", "orig", "sic"))
"""Of a ``choice``, the expanded, regularised or corrected reading is read."""
_NOTHING = "_"


_LONGEST_REST = 2**16
_NEW_PARAGRAPH = "# newpar\n"


class _Sink:
    """Text, and lines of words beside it as long as these may be wanted."""

    def __init__(self, lines: bool = True, text: bool = True) -> None:
        self.flow = Flow()
        self.lines: list[str] = []
        self.with_lines = lines
        self.with_text = text
        self.ready = 0
        """Lines up to the end of the last whole sentence."""
        self.size = 0
        self._word: tuple[str, str, str] | None = None
        self._gap = True
        self._joins_right = False
        self._rest: list[str] = []
        """Text outside of words, not yet divided."""
        self._rest_size = 0

    def text(self, data: str) -> None:
        """Text outside of words."""
        self.size += len(data)
        if self.with_text:
            self.flow.text(data)
        if self.with_lines:
            if not self._rest and data.isspace():
                self._gap = True
                return
            self._rest.append(data)
            self._rest_size += len(data)
            if self._rest_size > _LONGEST_REST:
                rest = "".join(self._rest)
                cut = max(rest.rfind(" "), rest.rfind("\n")) + 1 or len(rest)
                self._rest = [rest[:cut]]
                self._divide()
                self._rest, self._rest_size = [rest[cut:]], len(rest) - cut

    def _divide(self) -> None:
        """Text outside of words as words, where it is more than space."""
        if not self._rest:
            return
        rest = "".join(self._rest)
        self._rest, self._rest_size = [], 0
        parts = rest.split()
        self._gap |= rest[:1].isspace()
        for part in parts:
            self._put(part, _NOTHING, _NOTHING)
            self._gap = True
        if parts:
            self._gap = rest[-1].isspace()

    def word(self, form: str, lemma: str, word_class: str, join: str) -> None:
        """A marked word."""
        if self.with_text:
            self.flow.text(form)
        if not self.with_lines:
            return
        if self._rest:
            self._divide()
        if join in ("left", "both"):
            self._gap = False
        self._put(form, lemma, word_class)
        self._gap, self._joins_right = False, join in ("right", "both")

    def _put(self, form: str, lemma: str, word_class: str) -> None:
        self._write(self._gap and not self._joins_right)
        self._word = (form, lemma, word_class)
        self._gap = self._joins_right = False
        self.size += len(form)

    def _write(self, gap: bool) -> None:
        """The word before, now that it is known whether a space follows."""
        if self._word is not None:
            self.lines.append("\t".join((*self._word, _NOTHING if gap else "SpaceAfter=No")) + "\n")
            self._word = None

    def end_sentence(self) -> None:
        """The sentence ends here, if it has begun."""
        self._divide()
        self._write(True)
        if self.lines and self.lines[-1] not in ("\n", _NEW_PARAGRAPH):
            self.lines.append("\n")
            self.ready = len(self.lines)
        self._gap = True

    def end_paragraph(self) -> None:
        """The paragraph ends here, if it has begun."""
        self.flow.end_paragraph()
        self.end_sentence()
        if self.lines and self.lines[-1] == "\n":
            self.lines.append(_NEW_PARAGRAPH)

    def take_lines(self) -> str:
        """The whole sentences that have been collected."""
        if not self.ready:
            return ""
        taken = "".join(self.lines[: self.ready])
        del self.lines[: self.ready]
        self.ready = 0
        self.size = sum(map(len, self.lines))
        return taken

    def take_text(self) -> str:
        """The text that has been collected."""
        self.size = 0
        return self.flow.take()


class Body:
    """Receives the elements of one body.

    Read are paragraphs and all that stands in them, verses (a stanza is a
    paragraph), speeches, lists, tables, captions. Notes follow the paragraph
    they stand in. Left out are deletions, running heads, pictures, variant
    readings, and of a ``choice`` what was corrected, regularised or expanded.

    Parameters
    ----------
    annotated : bool
        Whether words are wanted for certain: a body before this one had them.
    """

    def __init__(self, annotated: bool) -> None:
        self.marks_words = annotated
        self.size = 0
        """Characters waiting to be taken."""
        self._sinks = [_Sink()]
        self._aside: list[_Sink] = []
        self._depth = 0
        self._left_out = 0
        self._choices: list[int] = []
        """Depths of the ``choice`` elements that are open."""
        self._word_depth = 0
        self._word: list[str] = []
        self._word_attributes: Mapping[str, str] = {}
        self._fragment: tuple[str, Mapping[str, str]] | None = None

    def decide(self, annotated: bool) -> None:
        """Whether words or text will be taken."""
        for sink in (*self._sinks, *self._aside):
            sink.with_lines, sink.with_text = annotated, not annotated

    def at_end(self, name: str) -> bool:
        """Whether an end tag is that of the body itself."""
        return name == "body" and self._depth == 0

    def start(self, name: str, attributes: Mapping[str, str]) -> None:
        """An element in the body begins."""
        self._depth += 1
        if self._left_out:
            return
        if name in _LEFT_OUT or (self._choices and name in _CHOSEN_AGAINST and self._choices[-1] == self._depth - 1):
            self._left_out = self._depth
        elif name == "choice":
            self._choices.append(self._depth)
        elif name in ("w", "pc"):
            if not self._word_depth:
                self.marks_words |= name == "w"
                self._word_depth, self._word, self._word_attributes = self._depth, [], attributes
        elif name in _ASIDE:
            self._sinks.append(_Sink(self._sinks[0].with_lines, self._sinks[0].with_text))
        elif name in _BLOCKS:
            self._end_paragraph()
        elif name in ("lb", "l") and attributes.get("break") != "no":
            self._text(" ")

    def end(self, name: str) -> None:
        """An element in the body ends."""
        depth, self._depth = self._depth, self._depth - 1
        if self._left_out:
            self._left_out = 0 if depth == self._left_out else self._left_out
        elif depth == self._word_depth:
            self._end_word(name)
        elif name == "choice":
            self._choices.pop()
        elif name == "s":
            self._sinks[-1].end_sentence()
            self._sinks[-1].text(" ")
        elif name in _ASIDE:
            sink = self._sinks.pop()
            sink.end_paragraph()
            self._aside.append(sink)
        elif name in _BLOCKS:
            self._end_paragraph()
        elif name == "l":
            self._text(" ")

    def text(self, data: str) -> None:
        """Text of the body."""
        if not self._left_out:
            self._text(data)

    def _text(self, data: str) -> None:
        self.size += len(data)
        if self._word_depth:
            self._word.append(data)
        else:
            self._sinks[-1].text(data)

    def _end_word(self, name: str) -> None:
        attributes = self._word_attributes
        form = "".join(self._word)
        if not form.isalnum():
            form = "".join(form.split())
        self._word_depth = 0
        part = attributes.get("part", "N")
        if part in ("I", "M", "F") and name == "w":
            before = self._fragment
            if before is not None and part != "I":
                form, attributes = before[0] + form, {**attributes, **before[1]}
            self._fragment = (form, attributes) if part != "F" else None
            if part != "F":
                return
        if not form:
            return
        lemma = _field(attributes.get("lemma"), _NOTHING)
        word_class = _field(attributes.get("pos"), "PUNCT" if name == "pc" else _NOTHING)
        self._sinks[-1].word(form, lemma, word_class, attributes.get("join", ""))

    def _end_paragraph(self) -> None:
        self._sinks[-1].end_paragraph()
        if len(self._sinks) == 1 and self._aside:
            for aside in self._aside:
                self._append(aside)
            self._aside.clear()

    def _append(self, aside: _Sink) -> None:
        main = self._sinks[0]
        for paragraph in aside.flow.take().split(PARAGRAPH_END):
            main.flow.text(paragraph)
            main.flow.end_paragraph()
        main.lines.extend(aside.lines)
        main.ready = len(main.lines)
        main.size += aside.size

    def close(self) -> None:
        """The body ends."""
        self._end_paragraph()

    def take(self, annotated: bool) -> str:
        """What is ready: whole sentences of lines, or text."""
        sink = self._sinks[0]
        if annotated:
            sink.flow.take()
            taken = sink.take_lines()
        else:
            sink.lines.clear()
            taken = sink.take_text()
        if taken:
            self.size = sum(sink.size for sink in (*self._sinks, *self._aside))
        return taken


def _field(value: str | None, otherwise: str) -> str:
    """An attribute as a column: without tabs and line ends."""
    if value is None:
        return otherwise
    return value if value.isalnum() else "_".join(value.split()) or otherwise
