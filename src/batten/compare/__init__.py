"""The grid of remedies: held-out scores, ties, choice, and what the choice hangs on."""
