"""The diagnostics room: conserved quantities, budgets, and the fields that follow from u, v and eta."""
