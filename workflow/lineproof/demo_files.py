"""What the study file may ask of the demo market; known without importing what makes it."""

RAW = ("returns.csv", "market.csv", "riskless.csv", "sector_indices.csv")
TRUTH = ("truth_eras.parquet", "truth_betas.parquet", "truth_faults.parquet")
SHORTEST = 60  # months
