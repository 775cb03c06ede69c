"""The frequency wing: records, screening, stability, noise and the uncertainty of a mean."""
