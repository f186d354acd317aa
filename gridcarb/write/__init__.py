"""Stores, files and the folder that holds them: whole or not at all, and never over an earlier result before its time."""
