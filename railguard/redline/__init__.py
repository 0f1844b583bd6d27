"""Redline: what to change on the cards, proved by a review of the changed deck."""
