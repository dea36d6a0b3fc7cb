"""Makes this folder importable: the judge in ``talbot`` serves several tests here."""
