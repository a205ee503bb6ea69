"""Laws of the launch direction, one file a law."""
