"""Kernels for jobs over whole collections, compiled by numba and kept on disk; optional.

The only room that imports numba, entered through engine.bulk alone. Each kernel follows the numpy
engine step by step and equals it (tests/engine/compiled). Loops over populations are what they are
for. Only chains closed by 1 / m with half the width inside groups are followed
(`engine.in_place.followed`).
"""
