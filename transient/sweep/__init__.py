"""Many cases: which (``plan``), where they are solved (``places``), what comes of it (``table``); ``size``."""
