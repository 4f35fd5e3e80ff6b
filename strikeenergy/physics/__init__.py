"""The laws: pure functions of SI numbers or arrays. No objects, no files, no units library."""
