"""Lines of text around words: finding places in the token stream, and showing what stands there."""
