"""Loads for a structural check, from the wall histories of a finished result; nothing is solved here."""
