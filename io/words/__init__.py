"""The statement in words, tables and JSON: units and roundings are chosen here and nowhere else."""
