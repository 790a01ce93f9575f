"""Results on disk: chunks that survive any crash, their manifest, and the ensemble as one CF netCDF file.

The only place that knows file names, netCDF variables and attributes.  Files are touched by one thread of one
process.
"""
