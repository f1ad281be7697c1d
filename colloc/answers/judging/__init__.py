"""Decisions about pairs and expressions: what can be judged, what stands behind it, and what was decided."""
