"""Does the trial file still say what it said? Chain, bytes, and every frozen number computed again."""
