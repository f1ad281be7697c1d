"""Which measure finds what a person, or a list, calls right."""
