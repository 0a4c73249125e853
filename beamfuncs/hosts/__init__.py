"""One thin adapter a host: each hands plain cell values to `beamfuncs.functions` and shows what comes back."""
