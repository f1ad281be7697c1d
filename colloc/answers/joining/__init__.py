"""Expressions joined in running text."""
