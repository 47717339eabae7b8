"""Numbers only: least squares, searches, folds, smearing. Knows numpy and scipy, nothing of names or frames."""
