"""One module a sheet: each shows results, none computes."""
