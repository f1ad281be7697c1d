"""Change over time: words and pairs by period, and what changed most."""
