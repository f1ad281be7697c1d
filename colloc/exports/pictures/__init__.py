"""Answers as pictures: SVG or PNG, drawn with matplotlib, the same bytes for the same answer."""
