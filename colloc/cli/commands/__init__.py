"""The commands, a module a group; each has ``register(app)``."""
