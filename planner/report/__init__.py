"""One answer, many forms: ``view`` words and rounds it, every other file shows the same view."""
