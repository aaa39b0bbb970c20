"""Judge a plan, independently of the planner."""
