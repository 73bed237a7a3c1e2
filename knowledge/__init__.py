"""byway.knowledge: graph, geometry, damage, capacity, accounts and cases. Never imports byway.widgets."""
