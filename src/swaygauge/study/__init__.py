"""Studies of a network's stored nights: which share of 1/lambda suits it, and how steady its places are.

Run on request, never by the night. They solve anew what they compare; nothing they find changes a stored night.
"""
