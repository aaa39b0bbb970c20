"""Choose recipes, workspace, lenders and sites for the calls of a quantum program."""
