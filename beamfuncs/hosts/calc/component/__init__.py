"""What runs inside the office: the standard library and the office's own modules alone, Python 3.8 and later.

The extension holds this package as `beamfuncs_component`, and beside it the two modules that the office registers.
"""
