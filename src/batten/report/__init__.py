"""Results as figures, HTML, text and write-up; computes no statistics."""
