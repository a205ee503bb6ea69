"""What an observation file may hold: a measured profile, where it was seen from and through what, what is to be fitted.

It must not know products or how a profile is fitted.
"""
