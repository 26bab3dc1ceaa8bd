"""The values that every room speaks: frozen, self-validating, with units in their names. No I/O, clock or thread."""
