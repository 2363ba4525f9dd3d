"""The places of the work area, one for each question of the job."""
