"""The only place that meets formulas, data frames and the user's names; further in there are only numbers."""
