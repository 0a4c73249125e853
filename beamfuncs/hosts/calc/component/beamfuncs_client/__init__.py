"""How a host in another Python talks to the function server: the standard library alone, Python 3.8 and later.

This package is part of the LibreOffice extension, and the server imports it too, so that the messages stand once.
"""
