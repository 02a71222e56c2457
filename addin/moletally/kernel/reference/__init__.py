"""The reference engine: numpy, many cases at once; slower than the compiled one, and its judge."""
