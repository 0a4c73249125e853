"""The headless host: workbooks computed with no spreadsheet program. Start at `filling`."""
