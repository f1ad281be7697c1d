"""The evidence card of a pair: every number that bears on it, from its table down to its lines."""
