"""Who solves the rows of a chunk: the registry of sweep runners, fastest first.

A runner is a module with ``takes(base, keys) -> bool`` (whether it solves rows of this form at all) and
``solve(base, keys, values, columns) -> Columns``; a row that it does not vouch for it leaves with status "open", and the
next runner gets it.  ``each`` takes everything and leaves nothing open.
"""
