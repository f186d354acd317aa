"""The command line: words on a terminal, nothing else."""
