"""Solvers, families and statistics: arrays in, frozen records out; numpy and scipy only.

Nothing here reads or writes a file, prints, or knows of YAML, pandas, matplotlib or Snakemake. Randomness enters only
as arrays drawn elsewhere.
"""
