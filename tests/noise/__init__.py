"""Whole studies with noise against closed forms: what a run says of fields whose law is known."""
