"""Figures of a sweep: a map over two inputs, the spread over one, and which inputs matter."""
