"""Compiled loops of the solid model: numbers in, numbers out, each on a range of rows or elements.

`jit.kernel` compiles a function once and keeps it on disk, `parallel` runs it on ranges in several threads, `warm`
compiles all of them in advance. Every kernel has an equality test against scikit-fem's or scipy's plain path in
``tests/solid_model/test_kernels_*.py``.
"""
