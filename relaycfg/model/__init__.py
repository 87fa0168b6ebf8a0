"""Frozen data that every other part of the program reads: nothing here opens files, prints or computes a study."""
