"""The LibreOffice Calc host: an extension made from the catalogue, which asks the function server. Start at `packing`."""
