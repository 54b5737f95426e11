"""One panel a file: builds its widgets, binds inputs, draws on answer. Never computes."""
