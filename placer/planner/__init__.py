"""Decide: recipes, workspace, lenders, sites, timing."""
