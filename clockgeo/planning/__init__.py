"""Before the survey: prediction, optimal use of days, simulation."""
