"""Handbook cases and timings: ``python -m benchmarks``."""
