"""Accepted entries in open formats, one module a format; ``formats`` lists them."""
