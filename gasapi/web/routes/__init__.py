"""The routes: load a question, ask the service, write the answer down. No branching on physics."""
