"""What went into a store: its sources, and hashes by which repeats are known."""
