"""What lies under the tables: schema, steps to it, the lock, packed arrays."""
