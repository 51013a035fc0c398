"""The demo: an invented foundry and fabrication yard, loaded once from `fixtures/demo`."""
