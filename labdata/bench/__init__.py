"""Ratio benchmarks: what the service takes for a piece of work against plain scripts doing the same, in one run.

Only ratios carry from one machine to another. Times are CPU seconds of this process, medians of several runs.
"""
