"""byway.widgets: the bench and its panels. They hold no science; each draws what byway.knowledge says."""
