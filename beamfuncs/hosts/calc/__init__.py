"""The LibreOffice Calc host: an extension made from the catalogue that asks the function server. Start at `packing`."""
