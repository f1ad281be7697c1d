"""Readers of marked-up text: HTML, EPUB and TEI."""
