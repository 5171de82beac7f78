"""View -> Sheet: the only home of words and number formats, from which page, report and tables are set."""
