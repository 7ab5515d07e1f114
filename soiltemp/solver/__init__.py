"""The solver: arrays in, arrays out; `march` and `cycle` are its doors, the rest is numba."""
