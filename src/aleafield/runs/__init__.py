"""What becomes of a study: checked, planned, solved by workers, summarised, reported, extended, compared.

Here both halves of the package meet: forward models are built and handed to sampling, estimates and accounting.
"""
