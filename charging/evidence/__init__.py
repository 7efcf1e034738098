"""Every published figure the models are checked against, recomputed on demand."""
