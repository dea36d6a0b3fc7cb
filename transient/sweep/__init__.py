"""Many cases: which (``plan``), where (``run``, ``places``, ``cluster``), what comes out (``table``, ``says``, ``size``)."""
