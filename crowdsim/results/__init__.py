"""The HDF5 results file: writer, reader, summary. The format stands in DEVELOPERS.md.

Depends on numpy, h5py and response.
"""
