"""Its place makes this folder importable: helpers such as ``problems`` serve the tests of several rooms."""
