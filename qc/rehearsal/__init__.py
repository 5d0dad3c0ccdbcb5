"""Rehearsals: known faults put into a copy of a project's own results, to see what its rules would catch.

``faults`` lists the kinds of fault, ``run`` injects them and counts, ``services`` reads a project and keeps the answer
with its job. Nothing here writes results, flags or runs.
"""
