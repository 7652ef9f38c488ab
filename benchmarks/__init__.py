"""Ratios measured side by side in one run; ``python -m benchmarks`` prints the table."""
