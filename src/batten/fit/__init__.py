"""A remedy on one analysis sample: estimates, means in units of y, predictions, their uncertainty."""
