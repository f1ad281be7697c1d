"""Answers as HTML pages: each one file that needs nothing else, no script and no network."""
