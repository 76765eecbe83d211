"""Independent generators of units with known types, for accuracy tests and benchmarks.

None of them reads `templates/` or uses the engine's families; each is built on another idea.
"""
