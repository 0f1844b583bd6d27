"""The pipeline's former place, for a few hours: `railguard.review` becomes the function itself."""

from railguard.reviewing import DesignReview, Review, Simulator, review, review_deck

__all__ = ["DesignReview", "Review", "Simulator", "review", "review_deck"]
