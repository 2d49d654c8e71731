"""What a plan looks like: sheet, pictures, tables and files. Reads results, computes nothing."""
