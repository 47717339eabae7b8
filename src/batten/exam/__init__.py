"""The public facades: one examination, and each fit in it."""
