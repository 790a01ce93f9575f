"""The seam: a study's field behind one call, *evaluate a level on sample indices*."""
