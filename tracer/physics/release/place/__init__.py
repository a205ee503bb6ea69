"""Laws of the place of release, one file a law."""
