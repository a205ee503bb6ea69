"""From products and a measured profile to rates, law parameters and how sure they are.

A product's image goes through slit and seeing once, as a linear map; all that follows is algebra on profiles.
"""
