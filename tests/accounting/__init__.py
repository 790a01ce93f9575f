"""The error split recovers planted errors."""
