"""Archived runs: one write-once HDF5 file a run, and folders of them."""
