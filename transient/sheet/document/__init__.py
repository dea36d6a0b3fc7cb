"""The calculation sheet of a finished result: sections of plain blocks, printed as an HTML page or as a PDF."""
