"""Finds and explains word associations in text."""
