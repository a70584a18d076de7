"""Demo designs, one JSON file each; `index.json` lists them in the order in which they are offered."""
