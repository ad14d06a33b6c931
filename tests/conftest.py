"""Its place puts tests/ on the import path, so that every test may use builders.py."""
