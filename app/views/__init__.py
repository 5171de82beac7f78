"""LookResult -> what one side may see: unmasked, masked (turned to letters), open (pooled)."""
