"""View -> Sheet: the only home of words and number formats. Page, report and table files are set from these."""
