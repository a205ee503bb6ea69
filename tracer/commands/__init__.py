"""The command line, one file a command: parse, call, print, set the exit code.

This floor knows how people ask and what they are told; it must hold no physics.
"""
