"""What is wrong with one fit: bend, spread, influence."""
