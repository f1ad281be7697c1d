"""Measures over sub-corpora: tests over documents, information about slices, rates known from elsewhere."""
