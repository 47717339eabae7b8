"""What one fit says: span effects, slopes, constants, turning points, inverse questions, sentences."""
