"""Benchmarks: every figure is a ratio against a peer or a floor measured in the same run."""
