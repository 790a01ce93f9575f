"""Evidence from repeated trials: estimators are unbiased and their intervals cover."""
