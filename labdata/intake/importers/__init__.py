"""Readers of what is no table of results: surveys, tops and other records of the well, logs, interchange text."""
