"""The head panel: brain, lesion and bundles in three dimensions. Import ``byway.widgets.head.panel`` for it."""
