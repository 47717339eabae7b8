"""The parts of the widget: each shows results of one examination and computes no statistics."""
