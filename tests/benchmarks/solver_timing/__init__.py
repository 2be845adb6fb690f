"""The parts of `tests/benchmarks/solver_time.py`: shapes, meshes, children, what is timed, and the table."""
