"""Where batches run: each executor offers `map_batches`, which yields results as they come, in any order."""
