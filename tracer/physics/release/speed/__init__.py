"""Laws of the launch speed, one file a law."""
