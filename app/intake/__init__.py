"""What comes in: the plan file, the extract's files, and the samples and findings made of them."""
