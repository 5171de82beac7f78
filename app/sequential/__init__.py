"""Group-sequential tests: spending, boundaries, verdicts. Numbers in, frozen records out."""
